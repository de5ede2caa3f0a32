/** Holes that are added to a seam or retired from it. Pure. */
import { headsAt, rangesOf, type Hole, type Seam } from '$lib/logbook/fold/seam';
import type { Body } from '$lib/logbook/kinds';
import { MOST_HOLES } from '$lib/logbook/scalars';
import { FormReader, type Errors } from '../frame/form-reader';
import { fitting } from '../logbook/fitting';
import { holesNumbered } from './hole-numbers';

export interface AddTyped {
	count: string;
	first: string;
	/** Number of the hole they lie after; at the end when empty. */
	after: string;
	row: string;
	reason: string;
}
export interface RetireTyped {
	holes: string;
	reason: string;
}

type Read<Value> =
	({ readonly ok: true } & Value) | { readonly ok: false; readonly errors: Errors };

/** The next free number: numbers are never used again, not even those of retired holes. */
export function nextNumber(holes: readonly Pick<Hole, 'number'>[]): number {
	return holes.reduce((next, { number }) => Math.max(next, (number ?? 0) + 1), 1);
}

export function emptyAddition(seam: Pick<Seam, 'holes'>): AddTyped {
	return { count: '1', first: String(nextNumber(seam.holes)), after: '', row: '', reason: '' };
}

export function readAddition(
	typed: AddTyped,
	{ holes }: Pick<Seam, 'holes'>
): Read<{ readonly body: Body<'holes.added'> }> {
	const read = new FormReader();
	const count = read.whole('count', typed.count, 1, MOST_HOLES, 'How many holes are added?');
	const first = read.whole(
		'first',
		typed.first,
		0,
		1_000_000,
		'Which number has the first of them?'
	);
	const row = read.wholeOrNone('row', typed.row, 1, 50);
	const reason = read.text('reason', typed.reason, 200);
	const after = typed.after.trim() === '' ? undefined : holesNumbered(typed.after, holes);
	const [before] = after?.ok ? after.holes : [];
	if (after && !after.ok) read.refuse('after', after.says);
	else if (after?.ok && after.holes.length > 1) read.refuse('after', 'Write one number.');
	if (first !== undefined && count !== undefined) {
		const taken = holes.find(
			({ number }) => number !== undefined && number >= first && number < first + count
		);
		if (taken?.number !== undefined)
			read.refuse(
				'first',
				`Number ${taken.number} is taken, and numbers are never used again. ${nextNumber(holes)} is free.`
			);
	}
	if (Object.keys(read.errors).length > 0 || count === undefined || first === undefined)
		return { ok: false, errors: read.errors };
	return {
		ok: true,
		body: {
			count,
			first,
			...(row !== undefined && { row }),
			...(before && {
				after: { ...(before.by !== undefined && { by: before.by }), index: before.index }
			}),
			...(reason !== undefined && { reason })
		}
	};
}

/** A line that retires holes, and what it stands on. */
export interface Retirement {
	readonly body: Body<'holes.retired'>;
	readonly on: readonly string[];
}

/** One line, or as many as so many holes take: for one act. */
export function readRetirement(
	typed: RetireTyped,
	{ holes }: Pick<Seam, 'holes'>
): Read<{ readonly lines: readonly Retirement[] }> {
	const read = new FormReader();
	const reason = read.text('reason', typed.reason, 200);
	const found = holesNumbered(
		typed.holes,
		holes.filter(({ state }) => state !== 'retired')
	);
	if (!found.ok) read.refuse('holes', found.says);
	if (!found.ok || Object.keys(read.errors).length > 0) return { ok: false, errors: read.errors };
	return {
		ok: true,
		lines: fitting(found.holes, ({ heads }) => heads).map((some) => ({
			body: { holes: rangesOf(some), ...(reason !== undefined && { reason }) },
			on: headsAt(some)
		}))
	};
}
