/** The words for rivets and holes, which the bench needs before any others. */
import type { Fault, Method } from '$lib/logbook/kinds';

export const FAULT_WORDS: Readonly<Record<Fault, string>> = {
	under_driven: 'under-driven',
	over_driven: 'over-driven',
	tipped: 'tipped',
	off_centre: 'off-centre',
	smile: 'smile',
	gap: 'gap under the head',
	sheets_apart: 'sheets apart',
	cracked: 'cracked',
	bent_over: 'bent over',
	proud: 'proud',
	low: 'low',
	enlarged_hole: 'enlarged hole',
	edge_short: 'edge short',
	wrong_rivet: 'wrong rivet',
	loose: 'loose',
	other: 'other'
};

export const METHOD_WORDS: Readonly<Record<Method, string>> = {
	driven: 'driven',
	squeezed: 'squeezed',
	back_riveted: 'back-riveted',
	pulled: 'pulled',
	screw: 'screw',
	bolt: 'bolt',
	not_recorded: 'method not recorded'
};

/** `[27,28,29,31]` as "27–29, 31". Any order, each once. */
export function numbersText(numbers: readonly number[]): string {
	const sorted = [...new Set(numbers)].sort((a, b) => a - b);
	const ranges: [number, number][] = [];
	for (const number of sorted) {
		const last = ranges.at(-1);
		if (last && number === last[1] + 1) last[1] = number;
		else ranges.push([number, number]);
	}
	return ranges.map(([from, to]) => (from === to ? String(from) : `${from}–${to}`)).join(', ');
}

/** A part number as stamped: `ms20426ad3-3.5` as "MS20426 AD 3-3.5". What is not one stays as it was read. */
export function stamped(callout: string): string {
	const parts = /^(MS|NAS|AN|CR|CCR)(\d+)([A-Z]{1,3})(\d.*)$/.exec(callout.toUpperCase());
	return parts ? `${parts[1]}${parts[2]} ${parts[3]} ${parts[4]}` : callout;
}
