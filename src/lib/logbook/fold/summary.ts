/** What a build needs to know of a seam without folding it again. Build totals are sums of these. */
import type { Entry } from '../entry';
import { isKind, type Line } from './line';
import { FOLD_VERSION, type Seam } from './seam';

export interface SeamSummary {
	readonly fold: number;
	readonly seam: string;
	readonly assembly: string;
	readonly name: string;
	/** As planned for the whole seam; ranges may differ. */
	readonly callout?: string;
	readonly order: number;
	readonly people: 1 | 2;
	readonly closes: boolean;
	readonly retired: boolean;
	/** Holes of the plan that are not retired; the four after it add up to it, with `contested` and `drilledOut`. */
	readonly holes: number;
	readonly driven: number;
	readonly open: number;
	readonly leftOpen: number;
	readonly drilledOut: number;
	readonly contested: number;
	/** Of those driven, logged twice. */
	readonly twice: number;
	/** Rivets in holes that no plan wants. Not among `driven`. */
	readonly outside: number;
	/** Holes with a defect that is not settled. */
	readonly defects: number;
	readonly findings: number;
	readonly lines: number;
	readonly struck: number;
	/** Rivets that stand, by evening and by who drove them (the shooter, else who wrote it down). */
	readonly evenings: Readonly<Record<string, Readonly<Record<string, number>>>>;
	/** The last line in order that people wrote. */
	readonly last?: {
		readonly id: string;
		readonly n: number;
		readonly at: string;
		readonly author: string;
	};
}

export function summarise(seam: Seam): SeamSummary {
	const byId = new Map(seam.lines.map((line) => [line.id, line]));
	const count = { driven: 0, open: 0, left_open: 0, drilled_out: 0, contested: 0, retired: 0 };
	const evenings: Record<string, Record<string, number>> = {};
	let outside = 0;
	let twice = 0;
	for (const hole of seam.holes) {
		if (hole.outside) outside++;
		if (hole.number === undefined) continue;
		count[hole.state]++;
		if (hole.twice) twice++;
		if (hole.state === 'driven') credit(evenings, byId.get(hole.heads[0] ?? ''));
	}
	const last = seam.lines.at(-1)?.envelope;
	return {
		fold: FOLD_VERSION,
		seam: seam.id,
		assembly: seam.plan.assembly ?? '',
		name: seam.plan.name,
		...(seam.plan.callout !== undefined && { callout: seam.plan.callout }),
		order: seam.plan.order,
		people: seam.plan.people,
		closes: seam.plan.closes,
		retired: seam.retired,
		holes: count.driven + count.open + count.left_open + count.drilled_out + count.contested,
		driven: count.driven,
		open: count.open,
		leftOpen: count.left_open,
		drilledOut: count.drilled_out,
		contested: count.contested,
		twice,
		outside,
		defects: seam.holes.filter((hole) => hole.defects.length > 0).length,
		findings: seam.findings.length,
		lines: seam.lines.length,
		struck: seam.struck.size,
		evenings,
		...(last && { last: { id: last.id, n: last.n, at: last.at, author: last.author } })
	};
}

/** One rivet for who drove it, that evening. What was done before this log began belongs to no evening. */
function credit(evenings: Record<string, Record<string, number>>, line: Line | undefined): void {
	if (!line || !isKind(line, 'holes.driven')) return;
	const day = eveningOf(line.entry);
	if (day === undefined) return;
	const person = line.entry.body.shooter ?? line.entry.author;
	const evening = (evenings[day] ??= {});
	evening[person] = (evening[person] ?? 0) + 1;
}

/**
 * The evening a line belongs to, as a calendar day: a day ends at 04:00 by the clock on the wall where it was written.
 * Undefined for what happened before this log began, or at no exact time.
 */
export function eveningOf({ at, when }: Pick<Entry, 'at' | 'when'>): string | undefined {
	if (when && when.is !== 'exact') return undefined;
	const local = Date.parse(`${(when ? when.at : at).slice(0, 23)}Z`);
	return new Date(local - 4 * 3_600_000).toISOString().slice(0, 10);
}

/** The numbers of a summary that may be added up. */
const ADDABLE = [
	'holes',
	'driven',
	'open',
	'leftOpen',
	'drilledOut',
	'contested',
	'twice',
	'outside',
	'defects',
	'findings',
	'lines',
	'struck'
] as const;
export type Totals = Record<(typeof ADDABLE)[number], number> & { seams: number };

/** Sums over seams; those retired count only for what is in them outside any plan, and for their lines. */
export function totalsOf(summaries: Iterable<SeamSummary>): Totals {
	const totals: Totals = {
		seams: 0,
		holes: 0,
		driven: 0,
		open: 0,
		leftOpen: 0,
		drilledOut: 0,
		contested: 0,
		twice: 0,
		outside: 0,
		defects: 0,
		findings: 0,
		lines: 0,
		struck: 0
	};
	for (const summary of summaries) {
		if (summary.retired) {
			totals.outside += summary.outside + summary.driven;
			totals.lines += summary.lines;
			totals.struck += summary.struck;
			continue;
		}
		totals.seams++;
		for (const key of ADDABLE) totals[key] += summary[key];
	}
	return totals;
}
