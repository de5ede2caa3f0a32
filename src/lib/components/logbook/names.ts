/** What is called what: people, parts and holes, for every screen that says a line or a hole in words. */
import { holesOf, type Entry } from '$lib/logbook/entry';
import type { Build } from '$lib/logbook/fold/build';
import { holeKey, type Seam } from '$lib/logbook/fold/seam';
import { counted } from '../frame/numbers';
import { numbersText } from './rivet-words';

/** What ids are called. Each answers with something to read also for an id it does not know. */
export interface Names {
	person(id: string): string;
	seam(id: string): string;
	assembly(id: string): string;
	/** What is written on the skin beside a hole, where the plan is known. */
	holeNumber(seam: string, by: string | undefined, index: number): number | undefined;
	/** Another line, in a few words. */
	line(id: string): string;
}

/** The numbers of the holes a line names: "27–31", or what can be said without the plan. */
export function holesText(entry: Entry, names: Pick<Names, 'holeNumber'>): string {
	const seam = entry.seam ?? '';
	const ranges = holesOf(entry);
	const numbers: number[] = [];
	let unnumbered = 0;
	for (const { by, from, to } of ranges)
		for (let index = from; index <= to; index++) {
			const number = names.holeNumber(seam, by === seam ? undefined : by, index);
			if (number === undefined) unnumbered++;
			else numbers.push(number);
		}
	return [
		numbers.length > 0 && numbersText(numbers),
		unnumbered > 0 && `${counted(unnumbered, 'hole')} outside the plan`
	]
		.filter(Boolean)
		.join(' and ');
}

/** All names but those of other lines: what the bench needs, without the words of every kind. */
export function placeNames(
	{
		seams,
		build,
		person
	}: {
		readonly seams: ReadonlyMap<string, Seam>;
		readonly build: Pick<Build, 'assemblies'>;
		readonly person: (id: string) => string;
	},
	/** Names of seams that are not folded here. */
	seamName: (id: string) => string | undefined = () => undefined
): Omit<Names, 'line'> {
	const assemblies = new Map(build.assemblies.map(({ id, name }) => [id, name]));
	const numbers = new Map<string, ReadonlyMap<string, number>>();
	const numbersOf = (seam: string) => {
		const known = numbers.get(seam);
		if (known) return known;
		const made = new Map<string, number>();
		for (const { key, number } of seams.get(seam)?.holes ?? [])
			if (number !== undefined) made.set(key, number);
		numbers.set(seam, made);
		return made;
	};
	return {
		person,
		seam: (id) => seams.get(id)?.plan.name || seamName(id) || 'a seam not known here',
		assembly: (id) => assemblies.get(id) ?? 'an assembly not known here',
		holeNumber: (seam, by, index) => numbersOf(seam).get(holeKey(by, index))
	};
}
