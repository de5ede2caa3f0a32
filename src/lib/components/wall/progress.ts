/** What the wall shows, out of the summaries of the seams. Pure; no seam is folded again for it. */
import type { Assembly } from '$lib/logbook/fold/build';
import { totalsOf, type SeamSummary, type Totals } from '$lib/logbook/fold/summary';

export interface AssemblyProgress {
	readonly id: string;
	readonly name: string;
	/** Name of the shape it is drawn as. */
	readonly outline?: string;
	readonly order: number;
	/** Its plan is here; seams can name an assembly whose line has not arrived. */
	readonly known: boolean;
	readonly retired: boolean;
	readonly closed: boolean;
	readonly totals: Totals;
	/** In order, retired ones last. */
	readonly seams: readonly SeamSummary[];
}

/** Assemblies in order, each with its seams; last the seams whose assembly is not here. */
export function progressOf(
	assemblies: readonly Assembly[],
	summaries: readonly SeamSummary[]
): AssemblyProgress[] {
	const byAssembly = new Map<string, SeamSummary[]>();
	for (const summary of summaries) {
		const list = byAssembly.get(summary.assembly);
		if (list) list.push(summary);
		else byAssembly.set(summary.assembly, [summary]);
	}
	const known = assemblies.map((assembly): AssemblyProgress => {
		const { id, name, outline, order, retired, closed } = assembly;
		const seams = (byAssembly.get(id) ?? []).sort(bySeamOrder);
		byAssembly.delete(id);
		return {
			id,
			name,
			...(outline !== undefined && { outline }),
			order,
			known: true,
			retired,
			closed,
			totals: totalsOf(seams),
			seams
		};
	});
	const stray = [...byAssembly.values()].flat().sort(bySeamOrder);
	if (stray.length === 0) return known;
	const totals = totalsOf(stray);
	const rest = { order: 0, known: false, retired: false, closed: false, totals, seams: stray };
	return [...known, { id: 'stray', name: 'Assembly not here yet', ...rest }];
}

function bySeamOrder(a: SeamSummary, b: SeamSummary): number {
	return Number(a.retired) - Number(b.retired) || a.order - b.order || (a.seam < b.seam ? -1 : 1);
}

/** The state of an assembly or seam that deserves a tag; undefined where the count says it all. */
export function stateTag(
	{ holes, driven, leftOpen, defects, contested }: Totals | SeamSummary,
	closed = false
):
	| { readonly look: 'solid' | 'outline' | 'hatched' | 'grease'; readonly words: string }
	| undefined {
	if (defects > 0) return { look: 'grease', words: `${defects} with defect` };
	if (contested > 0) return { look: 'hatched', words: `${contested} contested` };
	if (closed) return { look: 'solid', words: 'closed' };
	if (holes > 0 && driven === holes) return { look: 'solid', words: 'all driven' };
	if (holes > 0 && leftOpen > 0 && driven + leftOpen === holes)
		return { look: 'outline', words: `${leftOpen} left open` };
	return undefined;
}

export interface Evening {
	/** The calendar day it began on. */
	readonly day: string;
	readonly rivets: number;
	/** Who drove, by name: never by how many. */
	readonly people: readonly string[];
	readonly seams: readonly { readonly summary: SeamSummary; readonly rivets: number }[];
}

/** The last evening on which anything was driven, no later than `today`. */
export function lastEvening(summaries: readonly SeamSummary[], today: string): Evening | undefined {
	let day = '';
	for (const { evenings, retired } of summaries)
		for (const evening of Object.keys(evenings))
			if (!retired && evening > day && evening <= today) day = evening;
	if (day === '') return undefined;
	const people = new Set<string>();
	const seams: { summary: SeamSummary; rivets: number }[] = [];
	for (const summary of summaries) {
		const evening = summary.retired ? undefined : summary.evenings[day];
		if (!evening) continue;
		for (const person of Object.keys(evening)) people.add(person);
		seams.push({ summary, rivets: Object.values(evening).reduce((sum, n) => sum + n, 0) });
	}
	return {
		day,
		rivets: seams.reduce((sum, { rivets }) => sum + rivets, 0),
		people: [...people],
		// The one worked on last comes first.
		seams: seams.sort((a, b) => (b.summary.last?.n ?? 0) - (a.summary.last?.n ?? 0))
	};
}

export type Need = 'defect' | 'contested' | 'finding' | 'two_people';
export interface Needed {
	readonly need: Need;
	readonly seam: SeamSummary;
}

/** What waits for somebody, the urgent first: a seam stands here once, under the first that applies. */
export function needsOf(progress: readonly AssemblyProgress[]): Needed[] {
	const needs: Needed[] = [];
	for (const { seams } of progress)
		for (const seam of seams) {
			if (seam.retired) continue;
			const need = needOf(seam);
			if (need) needs.push({ need, seam });
		}
	const rank: Readonly<Record<Need, number>> = {
		defect: 0,
		contested: 1,
		finding: 2,
		two_people: 3
	};
	return needs.sort((a, b) => rank[a.need] - rank[b.need]);
}

function needOf(seam: SeamSummary): Need | undefined {
	if (seam.defects > 0) return 'defect';
	if (seam.contested > 0) return 'contested';
	if (seam.findings > 0) return 'finding';
	return seam.people === 2 && seam.open > 0 ? 'two_people' : undefined;
}
