/** Where each hole of a seam is drawn: a column and a row of a grid, as the holes lie on the part. */
import type { Hole, HoleKey, SeamPlan } from '$lib/logbook/fold/seam';
import { workable } from './run';

export interface Place {
	readonly hole: Hole;
	/** From 0, in steps of half a pitch: staggered rows lie between. */
	readonly x: number;
	/** From 0. */
	readonly y: number;
}

export interface Layout {
	/** In the order of the holes. */
	readonly places: readonly Place[];
	/** Half pitches wide, rows high. */
	readonly width: number;
	readonly height: number;
}

export function layoutOf(seam: {
	readonly holes: readonly Hole[];
	readonly plan: Pick<SeamPlan, 'numbering' | 'layout'>;
}): Layout {
	const holes = workable(seam);
	const rows = new Map<number, Hole[]>();
	for (const hole of holes) {
		const row = rows.get(hole.row);
		if (row) row.push(hole);
		else rows.set(hole.row, [hole]);
	}
	const longest = Math.max(0, ...[...rows.values()].map((row) => row.length));
	const at = new Map<Hole, Place>();
	const sorted = [...rows].sort(([a], [b]) => a - b);
	for (const [y, [number, row]] of sorted.entries()) {
		const shift = seam.plan.layout === 'staggered' && y % 2 === 1 ? 1 : 0;
		// Back and forth: the second row is numbered on the way back, so it ends where the first begins.
		const back = seam.plan.numbering === 'back_and_forth' && number % 2 === 0;
		for (const [i, hole] of row.entries())
			at.set(hole, { hole, x: (back ? longest - 1 - i : i) * 2 + shift, y });
	}
	const places = holes.flatMap((hole) => at.get(hole) ?? []);
	return {
		places,
		width: Math.max(0, ...places.map(({ x }) => x)) + (places.length > 0 ? 2 : 0),
		height: sorted.length
	};
}

export interface OverviewMark {
	readonly x: number;
	readonly y: number;
	readonly wrong: boolean;
	readonly done: boolean;
	readonly tape: boolean;
	readonly lit: boolean;
}

/** Marks nearer than this would run into one another: then each stands for several holes. */
const MOST_MARKS = 100;

/** The seam in at most a hundred columns. A mark is done only when all its holes are, and wrong when any is. */
export function overviewOf(
	{ places, width }: Layout,
	next: ReadonlySet<HoleKey>
): { readonly marks: readonly OverviewMark[]; readonly columns: number } {
	const share = Math.max(1, Math.ceil(width / 2 / MOST_MARKS));
	const groups = new Map<string, { x: number; y: number; holes: Hole[] }>();
	for (const { hole, x, y } of places) {
		const at = share === 1 ? x / 2 : Math.floor(x / 2 / share);
		const name = `${at} ${y}`;
		const group = groups.get(name);
		if (group) group.holes.push(hole);
		else groups.set(name, { x: at, y, holes: [hole] });
	}
	return {
		columns: Math.max(1, Math.ceil(width / 2 / share)),
		marks: [...groups.values()].map(({ x, y, holes }) => ({
			x,
			y,
			wrong: holes.some((hole) => hole.defects.length > 0 || hole.state === 'contested'),
			done: holes.every((hole) => hole.state === 'driven'),
			tape: holes.some((hole) => hole.state === 'left_open'),
			lit: holes.some((hole) => next.has(hole.key))
		}))
	};
}
