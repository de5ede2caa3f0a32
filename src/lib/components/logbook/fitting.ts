/**
 * An act over many holes, in as many lines as it takes. A line names at most so many lines it stands on, so many ranges
 * of holes, and takes at most so many bytes; one that names more is refused, and with it the whole act. Pure.
 */
import { compare } from '$lib/logbook/entry';
import type { Hole } from '$lib/logbook/fold/seam';

/** Not more than `on` and `Holes` take; see logbook/entry.ts and logbook/scalars.ts. */
const MOST_ON = 800;
const MOST_RANGES = 400;
/** Of the 32 KiB of a line, those for holes and `on`: the rest is for the envelope and the longest note, in any script. */
const MOST_BYTES = 24_000;
const ID_BYTES = 39;
/** A range with its `by`. */
const RANGE_BYTES = 70;

type Placed = Pick<Hole, 'by' | 'index'>;

/**
 * Puts holes into groups of which each fits into one line. Most acts are one group; no holes are none.
 * @param on what a line about this hole stands on
 * @param besides how many more lines each line of the act stands on
 */
export function fitting<H extends Placed>(
	holes: readonly H[],
	on: (hole: H) => readonly string[],
	besides = 0
): H[][] {
	const groups: H[][] = [];
	let group: H[] | undefined;
	let ids = new Set<string>();
	let ranges = 0;
	// In the order of ranges, so that a group is as few of them as it can be.
	const sorted = [...holes].sort((a, b) => compare(a.by ?? '', b.by ?? '') || a.index - b.index);
	for (const hole of sorted) {
		const last = group?.at(-1);
		const added = on(hole).filter((id) => !ids.has(id));
		const begins = last?.by === hole.by && last?.index === hole.index - 1 ? 0 : 1;
		if (!group || !fits(ids.size + added.length + besides, ranges + begins)) {
			groups.push((group = [hole]));
			ids = new Set(on(hole));
			ranges = 1;
			continue;
		}
		group.push(hole);
		for (const id of added) ids.add(id);
		ranges += begins;
	}
	return groups;
}

function fits(ids: number, ranges: number): boolean {
	return (
		ids <= MOST_ON && ranges <= MOST_RANGES && ids * ID_BYTES + ranges * RANGE_BYTES <= MOST_BYTES
	);
}
