/** Figures and how they are shown: every one beside the raw floor it was measured with, in the same run. */
import { readFileSync } from 'node:fs';
import { cpus, loadavg } from 'node:os';

/** A row of the table. Without a floor there is nothing raw to compare with. */
export interface Row {
	readonly name: string;
	readonly unit: 'ms' | 's' | 'entries/s' | 'kB';
	readonly tallybar: Spread;
	readonly floor?: Spread;
	/** Of the product to the floor, for p50 and p95. */
	readonly ratio?: { readonly p50: number; readonly p95: number };
	readonly goal?: Goal;
	readonly note?: string;
}

export interface Spread {
	readonly n: number;
	readonly p50: number;
	readonly p95: number;
}

/** What was hoped for. Printed, never asserted: a bench on a busy machine proves nothing. */
export interface Goal {
	readonly text: string;
	readonly met: boolean;
}

export function spread(values: readonly number[]): Spread {
	const sorted = [...values].sort((a, b) => a - b);
	const at = (share: number) =>
		sorted[Math.max(0, Math.ceil(sorted.length * share) - 1)] ?? Number.NaN;
	return { n: sorted.length, p50: at(0.5), p95: at(0.95) };
}

export function ratioOf(tallybar: Spread, floor: Spread): { p50: number; p95: number } {
	return { p50: tallybar.p50 / floor.p50, p95: tallybar.p95 / floor.p95 };
}

export function atMost(ratio: number, most: number, of: string): Goal {
	return { text: `${of} ≤ ${most} x`, met: ratio <= most };
}

export function atLeast(ratio: number, least: number, of: string): Goal {
	return { text: `${of} ≥ ${least} x`, met: ratio >= least };
}

/** How busy the machine is: figures of a run at a load far above the number of cores mean little. */
export function machine() {
	const cores = cpus();
	return {
		node: process.version,
		cores: cores.length,
		cpu: cores[0]?.model ?? '',
		load: loadavg().map((value) => Math.round(value * 100) / 100),
		running: running()
	};
}

function running(): string {
	try {
		return readFileSync('/proc/loadavg', 'utf8').split(' ')[3] ?? '';
	} catch {
		return '';
	}
}

export function table(rows: readonly Row[]): string {
	const lines = [
		['', 'unit', 'n', 'p50', 'p95', 'floor p50', 'p95', 'ratio p50', 'p95', 'goal'],
		...rows.map(({ name, unit, tallybar, floor, ratio, goal }) => [
			name,
			unit,
			String(tallybar.n),
			short(tallybar.p50),
			short(tallybar.p95),
			short(floor?.p50),
			short(floor?.p95),
			short(ratio?.p50),
			short(ratio?.p95),
			goal ? `${goal.text}: ${goal.met ? 'met' : 'MISSED'}` : ''
		])
	];
	const widths = lines.reduce<number[]>(
		(most, cells) => cells.map((cell, i) => Math.max(most[i] ?? 0, cell.length)),
		[]
	);
	const words = new Set([0, 1, 9]);
	return lines
		.map((cells) =>
			cells
				.map((cell, i) =>
					words.has(i) ? cell.padEnd(widths[i] ?? 0) : cell.padStart(widths[i] ?? 0)
				)
				.join('  ')
				.trimEnd()
		)
		.join('\n');
}

function short(value: number | undefined): string {
	if (value === undefined) return '';
	if (!Number.isFinite(value)) return '?';
	return value >= 1000 ? value.toFixed(0) : value >= 10 ? value.toFixed(1) : value.toFixed(2);
}
