/** The seam on the front page: nobody's log, only what a tap does to a hole. Pure. */
import type { Mark } from '../marks/mark';

type Touch = 'open' | 'driven' | 'tipped' | 'drilled_out' | 'replaced';

/** Holes in their order; the place in the list is the number less one. */
export type TrySeam = readonly Touch[];

const RUN = 5;

/** What one tap makes of a hole: driven, found tipped, drilled out, replaced, and that one may be tipped as well. */
const AFTER: Readonly<Record<Touch, Touch>> = {
	open: 'driven',
	driven: 'tipped',
	tipped: 'drilled_out',
	drilled_out: 'replaced',
	replaced: 'tipped'
};

export const WORDS: Readonly<Record<Touch, string>> = {
	open: 'open',
	driven: 'driven',
	tipped: 'tipped, noted as a defect',
	drilled_out: 'drilled out',
	replaced: 'replaced'
};

export function begun(holes: number, driven: number): TrySeam {
	return Array.from({ length: holes }, (_, i) => (i < driven ? 'driven' : 'open'));
}

export function touched(seam: TrySeam, at: number): TrySeam {
	return seam.map((hole, i) => (i === at ? AFTER[hole] : hole));
}

/** The holes the next run goes into: the first open ones. */
export function nextRun(seam: TrySeam): readonly number[] {
	return seam.flatMap((hole, i) => (hole === 'open' ? [i] : [])).slice(0, RUN);
}

export function drive(seam: TrySeam): TrySeam {
	const run = new Set(nextRun(seam));
	return seam.map((hole, i) => (run.has(i) ? 'driven' : hole));
}

/** A tipped rivet is one that was driven. */
export function drivenIn(seam: TrySeam): number {
	return seam.filter((hole) => hole !== 'open' && hole !== 'drilled_out').length;
}

export function markFor(hole: Touch): Mark {
	const state = hole === 'open' || hole === 'drilled_out' ? hole : 'driven';
	return {
		state,
		twice: false,
		outside: false,
		defect: hole === 'tipped',
		suspect: false,
		notches: 0,
		ring: hole === 'replaced' ? 'replaced' : 'plain'
	};
}
