/**
 * What writes the lines: ids, Lamport counter, clock, and what each new line stands on. It keeps the heads of every hole
 * as the fold would find them, so that a log of any length costs its lines and no folds.
 */
import type { Entry, When } from '$lib/logbook/entry';
import { idMaker } from '$lib/logbook/id';
import type { Body, Holes, Kind } from '$lib/logbook/kinds';
import { rangesOf } from '$lib/logbook/fold/seam';
import type { Device } from './crew';
import type { Random } from './random';

export interface Hole {
	readonly by?: string;
	readonly index: number;
	/** Ids of its heads. */
	heads: readonly string[];
}

/** Kinds that become heads of the holes they name. */
type Holding = 'holes.driven' | 'holes.left_open' | 'holes.drilled_out' | 'holes.retired';
/** Kinds about holes that name the heads in `on` but do not become heads. */
type Remark = 'holes.looked_at' | 'defect.noted' | 'defect.decided' | 'defect.fixed';

interface About {
	readonly seam?: string;
	readonly assembly?: string;
	readonly on?: readonly string[];
	readonly when?: When;
	/** What the device knew, where it is less than everything. */
	readonly apart?: Apart;
}

/** The state a device that hears nothing from the others goes on from. */
export interface Apart {
	/** Highest number it knows. */
	n: number;
	readonly heads: ReadonlyMap<Hole, readonly string[]>;
}

interface PenOptions {
	/** Of the first line, which opens the build; in days since 1970. */
	readonly day: number;
	/** Minutes the clocks of the example are ahead of Greenwich, all year. */
	readonly offset: number;
	/** How many times faster than people this crew is: so that long logs do not need many years. */
	readonly pace: number;
	readonly build?: string | undefined;
}

export class Pen {
	readonly entries: Entry[] = [];
	/** Milliseconds since 1970. */
	clock: number;
	#n = 0;
	readonly #offset: number;
	readonly #pace: number;
	readonly #ids = new Map<string, () => string>();
	readonly #bySeam = new Map<string, Entry[]>();

	readonly build: string;

	constructor(
		readonly random: Random,
		{ day, offset, pace, build }: PenOptions
	) {
		this.#offset = offset;
		this.#pace = pace;
		this.clock = this.localTime(day, 14 * 60);
		this.build = build ?? this.newId('');
	}

	/** Lets time pass: so many seconds, both ends included. */
	wait(least: number, most: number): void {
		this.clock += Math.ceil((this.random.between(least, most) * 1000) / this.#pace);
	}

	/** An id as this device would make it now. */
	newId(device: string): string {
		let make = this.#ids.get(device);
		if (!make) {
			make = idMaker(
				() => this.clock,
				(bytes) => {
					this.random.fill(bytes);
				}
			);
			this.#ids.set(device, make);
		}
		return make();
	}

	write<K extends Kind>(by: Device, kind: K, body: Body<K>, about: About = {}): string {
		const { on = [], apart } = about;
		const id =
			kind === 'build.opened'
				? this.build
				: kind === 'seam.planned'
					? (about.seam ?? '')
					: kind === 'assembly.planned'
						? (about.assembly ?? '')
						: this.newId(by.id);
		const n = apart ? ++apart.n : this.#n + 1;
		this.#n = Math.max(this.#n, n);
		const entry = {
			id,
			build: this.build,
			kind,
			v: 1,
			...(about.seam !== undefined && { seam: about.seam }),
			...(about.assembly !== undefined && { assembly: about.assembly }),
			on: [...new Set(on)].sort(),
			n,
			device: by.id,
			author: by.person,
			at: this.wallTime(),
			...(about.when && { when: about.when }),
			body
		};
		// Kind and body belong together by this function's type; the union cannot follow a type parameter.
		const typed = entry as unknown as Entry;
		this.entries.push(typed);
		if (about.seam !== undefined) {
			const lines = this.#bySeam.get(about.seam);
			if (lines) lines.push(typed);
			else this.#bySeam.set(about.seam, [typed]);
		}
		return id;
	}

	/** Everything written about a seam so far. */
	linesOf(seam: string): readonly Entry[] {
		return this.#bySeam.get(seam) ?? [];
	}

	/** A line that becomes the state of holes, over what they were, or beside it when written apart. */
	hold<K extends Holding>(
		by: Device,
		kind: K,
		seam: string,
		holes: readonly Hole[],
		body: Omit<Body<K>, 'holes'>,
		about: Omit<About, 'seam' | 'on'> = {}
	): string {
		const { apart } = about;
		const on = holes.flatMap((hole) => apart?.heads.get(hole) ?? hole.heads);
		const named = { ...body, holes: rangesOf(holes) } as Body<K> & { holes: Holes };
		const id = this.write(by, kind, named, { ...about, seam, on });
		const alone = [id];
		for (const hole of holes) hole.heads = apart ? [...hole.heads, id] : alone;
		return id;
	}

	/** A line about holes as they are. @param on what else it stands on */
	remark<K extends Remark>(
		by: Device,
		kind: K,
		seam: string,
		holes: readonly Hole[],
		body: Omit<Body<K>, 'holes'>,
		on: readonly string[] = []
	): string {
		const named = { ...body, holes: rangesOf(holes) } as Body<K> & { holes: Holes };
		return this.write(by, kind, named, {
			seam,
			on: [...on, ...holes.flatMap((hole) => hole.heads)]
		});
	}

	/** What a device knows of these holes now, to let it go on from there later. */
	apart(holes: readonly Hole[]): Apart {
		return { n: this.#n, heads: new Map(holes.map((hole) => [hole, hole.heads])) };
	}

	/** Wall time with offset, where the example is built. */
	wallTime(ms = this.clock): string {
		const local = new Date(ms + this.#offset * 60_000).toISOString().slice(0, 23);
		const size = Math.abs(this.#offset);
		const two = (value: number) => String(value).padStart(2, '0');
		return `${local}${this.#offset < 0 ? '-' : '+'}${two(Math.trunc(size / 60))}:${two(size % 60)}`;
	}

	/** Milliseconds since 1970 at a minute of a local day. @param day days since 1970 */
	localTime(day: number, minute: number): number {
		return (day * 1440 + minute - this.#offset) * 60_000;
	}
}
