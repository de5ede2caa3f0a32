/** In which order seams are offered, and what a search finds. */
import type { SeamSummary } from '$lib/logbook/fold/summary';

const RECENT = 4;

export interface SeamGroups {
	/** Where somebody wrote last; not those that are done. */
	readonly recent: readonly SeamSummary[];
	readonly byAssembly: readonly {
		readonly id: string;
		readonly name: string;
		readonly seams: readonly SeamSummary[];
	}[];
}

export function groupSeams(
	seams: readonly SeamSummary[],
	assemblies: readonly { readonly id: string; readonly name: string }[]
): SeamGroups {
	// A plan is a line too: only a seam with a second line was worked on.
	const worked = seams.filter(
		({ driven, leftOpen, defects, contested, holes }) =>
			driven + leftOpen + defects + contested > 0 && driven < holes
	);
	const recent = [...worked].sort((a, b) => (b.last?.n ?? 0) - (a.last?.n ?? 0)).slice(0, RECENT);
	const groups = new Map(
		assemblies.map(({ id, name }) => [id, { id, name, seams: [] as SeamSummary[] }])
	);
	for (const seam of seams) {
		const group = groups.get(seam.assembly) ?? {
			id: seam.assembly,
			name: 'In no assembly known here',
			seams: []
		};
		group.seams.push(seam);
		groups.set(seam.assembly, group);
	}
	const byAssembly = [...groups.values()]
		.filter((group) => group.seams.length > 0)
		.map((group) => ({
			...group,
			seams: group.seams.sort(
				(a, b) => a.order - b.order || a.name.localeCompare(b.name, 'en', { numeric: true })
			)
		}));
	return { recent, byAssembly };
}

/** Does every word of the search stand in the seam's name, assembly or part number? Spaces in part numbers do not count. */
export function matches(
	search: string,
	{ name, callout = '' }: Pick<SeamSummary, 'name' | 'callout'>,
	assembly: string
): boolean {
	const text = `${name} ${assembly} ${callout}`.toLowerCase();
	const close = callout.toLowerCase().replace(/\s/g, '');
	return search
		.toLowerCase()
		.split(/\s+/)
		.every((word) => text.includes(word) || close.includes(word));
}
