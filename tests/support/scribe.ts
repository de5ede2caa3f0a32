/** Writes lines of one build for tests of the fold, with ids that can be told apart and n that grows. */
import { readEntry, writeEntry, type Entry, type Reading } from '../../src/lib/logbook/entry';
import { lineOf, type Line } from '../../src/lib/logbook/fold/line';
import type { Body, Kind } from '../../src/lib/logbook/kinds';

/** A UUID v7 made of a number, in the order of the numbers. */
export function idOf(number: number): string {
	return `01900000-0000-7000-8000-${number.toString(16).padStart(12, '0')}`;
}

export const BUILD = idOf(1);
export const ASSEMBLY = idOf(2);
export const ANA = idOf(0xa0);
export const JO = idOf(0xa1);

interface Options {
	on?: readonly Line[];
	seam?: string;
	assembly?: string;
	author?: string;
	device?: string;
	n?: number;
	id?: string;
	at?: string;
	when?: Entry['when'];
}

export class Scribe {
	#next = 1000;
	#n = 1;
	/** Everything written, in the order of writing. */
	readonly lines: Line[] = [];
	/** The wall time of what is written next. */
	now = '2026-03-14T20:15:00.000+01:00';

	write<K extends Kind>(kind: K, body: Body<K>, options: Options = {}): Line {
		const line = lineOf(this.read(kind, body, options)) as Line;
		this.lines.push(line);
		return line;
	}

	/** As {@link write}, but answers what `readEntry` says of it and keeps nothing. */
	read<K extends Kind>(kind: K, body: Body<K>, options: Options = {}): Reading {
		const reading = writeEntry(this.entry(kind, body, options));
		return reading.ok ? readEntry(reading.text) : reading;
	}

	entry<K extends Kind>(kind: K, body: Body<K>, options: Options = {}): Entry {
		const { on = [], n = this.#n++, id = idOf(this.#next++), author = ANA, ...rest } = options;
		return {
			id,
			build: BUILD,
			kind,
			v: 1,
			on: on.map((line) => line.id).sort(),
			n,
			device: rest.device ?? idOf(author === ANA ? 0xd0 : 0xd1),
			author,
			at: rest.at ?? this.now,
			...(rest.seam !== undefined && { seam: rest.seam }),
			...(rest.assembly !== undefined && { assembly: rest.assembly }),
			...(rest.when !== undefined && { when: rest.when }),
			body
		} as unknown as Entry;
	}

	/** A seam of so many holes; answers its id. */
	seam(count: number, plan: Partial<Body<'seam.planned'>> = {}): string {
		const id = idOf(this.#next++);
		this.write(
			'seam.planned',
			{ name: 'Skin to spar', assembly: ASSEMBLY, holes: { count, first: 1 }, ...plan },
			{ id, seam: id }
		);
		return id;
	}

	drive(seam: string, from: number, to: number, options: Options = {}): Line {
		return this.write(
			'holes.driven',
			{ holes: [{ from, to }], method: 'driven' },
			{ seam, ...options }
		);
	}

	strike(target: Line, keeps?: Line, options: Options = {}): Line {
		const { seam, assembly } = target.envelope;
		return this.write(
			'entry.struck',
			{
				entry: target.id,
				reason: keeps ? 'logged_twice' : 'undo',
				...(keeps && { keeps: keeps.id })
			},
			{ ...(seam && { seam }), ...(assembly && { assembly }), ...options }
		);
	}
}
