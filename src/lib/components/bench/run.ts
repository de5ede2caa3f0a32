/** Which holes come next. Pure: from the fold of a seam, a run length and what a person picked. */
import { headsAt, rangesOf, type Hole, type HoleKey, type Seam } from '$lib/logbook/fold/seam';
import { isKind, type Line } from '$lib/logbook/fold/line';
import type { Method } from '$lib/logbook/kinds';
import type { Draft } from '$lib/device/append';
import { fitting } from '../logbook/fitting';

export type RunLength = 1 | 2 | 5 | 10 | 'row';
export const RUN_LENGTHS: readonly RunLength[] = [1, 2, 5, 10, 'row'];

/** Picked by hand: from this hole, and up to that one once the second was tapped. */
export interface Pick {
	readonly first: HoleKey;
	readonly last?: HoleKey;
}

/** What the keys act on now. */
export interface Run {
	/** Holes that DRIVEN logs. */
	readonly drive: readonly Hole[];
	/** Holes with a rivet in them among the picked ones: what DEFECT is offered for. */
	readonly rivets: readonly Hole[];
	/** All picked holes; empty while the run follows the work by itself. */
	readonly picked: readonly Hole[];
}

/** Holes somebody works on: those of the plan, and rivets outside it. */
export function workable({ holes }: { readonly holes: readonly Hole[] }): Hole[] {
	return holes.filter((hole) => hole.state !== 'retired' || hole.outside);
}

/**
 * The run to drive next. Holes are taken as they lie, after the last run of this device and then from the beginning;
 * driven, left open and contested ones are passed over, and so are those planned to stay open. A run stays within its
 * row, and within holes of one callout and method: a line says one as-used callout.
 */
export function nextRun(seam: Seam, length: RunLength, device: string, pick?: Pick): Run {
	const holes = workable(seam);
	if (pick) {
		const picked = pickedHoles(holes, pick);
		const first = picked[0];
		// One tap on an open hole: the run begins there.
		if (pick.last === undefined && first && isToDrive(first))
			return { drive: runFrom(holes, first, length), rivets: [], picked };
		return {
			drive: picked.filter((hole) => isToDrive(hole) || hole.state === 'left_open'),
			rivets: picked.filter(hasRivet),
			picked
		};
	}
	const first = firstOpen(seam, holes, device);
	return { drive: first ? runFrom(holes, first, length) : [], rivets: [], picked: [] };
}

export function hasRivet(hole: Hole): boolean {
	return hole.state === 'driven' || hole.outside;
}

/** Waits for a rivet: open, or drilled out and to be filled again. */
function isToDrive(hole: Hole): boolean {
	return hole.number !== undefined && (hole.state === 'open' || hole.state === 'drilled_out');
}

function isNext(hole: Hole): boolean {
	return (
		hole.number !== undefined && hole.state === 'open' && hole.override?.leaveOpen === undefined
	);
}

function pickedHoles(holes: readonly Hole[], { first, last = first }: Pick): Hole[] {
	const a = holes.findIndex(({ key }) => key === first);
	const b = holes.findIndex(({ key }) => key === last);
	if (a < 0 || b < 0) return [];
	return holes.slice(Math.min(a, b), Math.max(a, b) + 1);
}

/** Where the work goes on: behind the last run of this device, then from the beginning, then what was drilled out. */
function firstOpen(seam: Seam, holes: readonly Hole[], device: string): Hole | undefined {
	const last = lastRun(seam, device);
	const at = last ? holes.findLastIndex((hole) => hole.heads.includes(last.id)) : -1;
	return (
		holes.slice(at + 1).find(isNext) ??
		holes.find(isNext) ??
		holes.find((hole) => hole.state === 'drilled_out' && hole.number !== undefined)
	);
}

function lastRun(seam: Seam, device: string): Line | undefined {
	return seam.lines.findLast(
		(line) =>
			isKind(line, 'holes.driven') && line.envelope.device === device && !seam.struck.has(line.id)
	);
}

/** Up to so many holes from `first` on, in its row and planned alike. */
function runFrom(holes: readonly Hole[], first: Hole, length: RunLength): Hole[] {
	const most = length === 'row' ? Infinity : length;
	const like = first.state === 'drilled_out' ? isDrilledOut : isNext;
	const run: Hole[] = [first];
	for (const hole of holes.slice(holes.indexOf(first) + 1)) {
		if (run.length >= most || hole.row !== first.row || !plannedAlike(hole, first)) break;
		if (like(hole)) run.push(hole);
	}
	return run;
}

const isDrilledOut = (hole: Hole) => hole.state === 'drilled_out' && hole.number !== undefined;

function plannedAlike(a: Hole, b: Hole): boolean {
	return a.override?.callout === b.override?.callout && a.override?.method === b.override?.method;
}

/** How a run was driven, as the bench remembers it. */
export interface HowDriven {
	readonly method?: Method;
	readonly shooter?: string;
	readonly bucker?: string;
}

/** The method of a hole: what was chosen for the run, else what the plan says, else driven. */
export function methodOf(seam: Seam, hole: Hole | undefined, chosen?: Method): Method {
	return chosen ?? hole?.override?.method ?? seam.plan.method ?? 'driven';
}

/** The part number planned for a hole. */
export function calloutOf(seam: Seam, hole: Hole | undefined): string | undefined {
	return hole?.override?.callout ?? seam.plan.callout;
}

/**
 * The lines that log these holes as driven: one, or one for each callout and method among them, and more where so many
 * holes do not fit into one. They stand on what was known of the holes.
 */
export function drivenDrafts(
	seam: Seam,
	holes: readonly Hole[],
	{ method, shooter, bucker }: HowDriven
): Draft<'holes.driven'>[] {
	const groups = new Map<string, Hole[]>();
	for (const hole of holes) {
		const name = `${calloutOf(seam, hole) ?? ''} ${methodOf(seam, hole, method)}`;
		groups.set(name, [...(groups.get(name) ?? []), hole]);
	}
	const fit = [...groups.values()].flatMap((group) => fitting(group, ({ heads }) => heads));
	return fit.map((group) => {
		const callout = calloutOf(seam, group[0]);
		return {
			kind: 'holes.driven',
			seam: seam.id,
			on: headsAt(group),
			body: {
				holes: rangesOf(group),
				method: methodOf(seam, group[0], method),
				...(callout !== undefined && { callout }),
				...(shooter !== undefined && { shooter }),
				...(bucker !== undefined && { bucker })
			}
		};
	});
}

const BENCH_KINDS = [
	'holes.driven',
	'holes.left_open',
	'holes.drilled_out',
	'holes.looked_at',
	'reading.taken',
	'defect.noted',
	'defect.decided',
	'defect.fixed'
] as const;

/**
 * What undo would strike: the last lines of this person and device on this seam, together with those written in the
 * same moment (a replaced rivet is three lines). Empty when there is nothing to undo.
 */
export function lastWritten(seam: Seam, author: string, device: string): Line[] {
	const own = seam.lines.filter(
		(line) =>
			isKind(line, ...BENCH_KINDS) &&
			line.envelope.author === author &&
			line.envelope.device === device &&
			!seam.struck.has(line.id)
	);
	const last = own.at(-1);
	if (!last) return [];
	return own.filter(
		(line, i) =>
			line.envelope.at === last.envelope.at &&
			// Without a gap: one act numbers its lines one after another.
			last.envelope.n - line.envelope.n === own.length - 1 - i
	);
}

/** The strikes that undo lines, the last first. */
export function undoDrafts(seam: string, lines: readonly Line[]): Draft<'entry.struck'>[] {
	return [...lines].reverse().map((line) => ({
		kind: 'entry.struck',
		seam,
		on: [line.id],
		body: { entry: line.id, reason: 'undo' }
	}));
}

/** The numbers of holes that have one. */
export function numbersOf(holes: readonly Hole[]): number[] {
	return holes.map(({ number }) => number).filter((number) => number !== undefined);
}
