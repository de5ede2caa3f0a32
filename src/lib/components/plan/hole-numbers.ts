/** Holes as people write them: by the numbers on the skin. In a line they are named by identity. */
import type { Holes } from '$lib/logbook/kinds';
import type { Hole } from '$lib/logbook/fold/seam';
import { numbersText } from '../logbook/words';

/** What a number may stand for: the identity of a hole. */
export type Numbered = Pick<Hole, 'by' | 'index' | 'number'>;

type Refused = { readonly ok: false; readonly says: string };
export type NumbersRead =
	{ readonly ok: true; readonly ranges: readonly (readonly [number, number])[] } | Refused;

const RANGE = /^(\d{1,7})(?:(?:-|–|to)(\d{1,7}))?$/;

/** Reads `12-18, 20`, `12–18 20` or `12 to 18`. */
export function parseNumbers(text: string): NumbersRead {
	const parts = text
		.trim()
		.replace(/\s*(-|–|to)\s*/g, '$1')
		.split(/[\s,;]+/)
		.filter((part) => part !== '');
	if (parts.length === 0) return refused('Write the hole numbers, like 12-18 or 5, 7.');
	const ranges: [number, number][] = [];
	for (const part of parts) {
		const read = RANGE.exec(part);
		if (!read) return refused(`“${part.slice(0, 24)}” is not a hole number. Write 12-18 or 5, 7.`);
		const from = Number(read[1]);
		const to = Number(read[2] ?? read[1]);
		if (from > to) return refused(`${from}-${to} runs backwards. Write ${to}-${from}.`);
		ranges.push([from, to]);
	}
	return { ok: true, ranges };
}

/**
 * The holes with the numbers in a text, each once. A number that two holes carry means both.
 * @param holes those of the seam
 */
export function holesNumbered<H extends Numbered>(
	text: string,
	holes: readonly H[]
): { readonly ok: true; readonly holes: readonly H[] } | Refused {
	const read = parseNumbers(text);
	if (!read.ok) return read;
	const byNumber = new Map<number | undefined, H[]>();
	for (const hole of holes) {
		const alike = byNumber.get(hole.number);
		if (alike) alike.push(hole);
		else byNumber.set(hole.number, [hole]);
	}
	const found = new Set<H>();
	for (const [from, to] of read.ranges)
		for (let number = from; number <= to; number++) {
			const meant = byNumber.get(number);
			if (!meant) return refused(`There is no hole ${number} on this seam.`);
			for (const hole of meant) found.add(hole);
		}
	return { ok: true, holes: [...found] };
}

/** Holes a seam is planned with, before it is. */
export function plannedHoles(count: number, first: number): Numbered[] {
	return Array.from({ length: count }, (_, i) => ({ index: i + 1, number: first + i }));
}

/** The numbers of holes named by identity. */
export function numbersOf(ranges: Holes, holes: readonly Numbered[]): string {
	const named = holes.filter((hole) =>
		ranges.some(({ by, from, to }) => by === hole.by && from <= hole.index && hole.index <= to)
	);
	return numbersText(named.flatMap(({ number }) => number ?? []));
}

function refused(says: string): Refused {
	return { ok: false, says };
}
