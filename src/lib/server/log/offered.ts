/**
 * What a push offers, as far as it can be judged without the database: texts read and hashed, proofs recomputed. All
 * of it happens before the write transaction, which every other push waits for.
 */
import { hashText } from '$lib/logbook/bytes';
import { next } from '$lib/logbook/chain';
import type { Place } from '$lib/logbook/chain';
import { placeStatement } from '$lib/logbook/chain';
import { readEntry, references } from '$lib/logbook/entry';
import type { Entry } from '$lib/logbook/entry';
import type { RefusalCode } from '$lib/logbook/refusals';
import type { Proof, PushRequest } from '$lib/logbook/wire';
import type { ServerKey } from './server-key';
import { isSignedBy, Seals } from './signatures';

/** A line that could be read; only such a line can enter the log. */
export interface Line {
	readonly entry: Entry;
	readonly text: string;
	readonly hash: string;
}

export type Offered =
	| (Line & { readonly id: string; readonly code?: undefined })
	| {
			readonly entry?: undefined;
			/** Null when it could not be made out. */
			readonly id: string | null;
			readonly text: string;
			readonly hash: string;
			/** Why it could not be read. */
			readonly code: RefusalCode;
			/** The build it names, where that could be made out. */
			readonly build?: string;
	  };

export function readOffered(text: string): Offered {
	const reading = readEntry(text);
	if (reading.ok) {
		const { entry, hash } = reading;
		return { entry, id: entry.id, text, hash };
	}
	if (reading.envelope) {
		const { code, hash } = reading;
		const { id, build } = reading.envelope;
		return { id, build, text, hash, code };
	}
	return { id: reading.id ?? null, text, hash: hashText(text), code: reading.code };
}

/** Every line an entry refers to: they must be looked up before it can be judged. */
export function referents(entry: Entry): string[] {
	const { bound, loose } = references(entry);
	return [...entry.on, ...bound, ...loose];
}

export class Batch {
	readonly build: string;
	readonly lines: readonly Offered[];
	/** Accepted once, before this server's history was lost: accepted again unjudged. */
	readonly #proven: ReadonlySet<string>;
	readonly #seals: Seals;
	/** Keys that devices bring along in this push. */
	readonly #keys = new Map<string, string>();
	readonly #key: ServerKey;
	readonly hasProof: boolean;

	constructor(key: ServerKey, build: string, request: PushRequest) {
		this.#key = key;
		this.build = build;
		this.lines = request.entries.map(readOffered);
		for (const { entry } of this.lines) {
			if (entry?.kind === 'device.enrolled' && !this.#keys.has(entry.device))
				this.#keys.set(entry.device, entry.body.key);
		}
		this.#seals = new Seals(build, request.seals, new Set(this.lines.map((line) => line.hash)));
		this.#proven = provenHashes(key, build, request.proofs ?? []);
		this.hasProof =
			this.#proven.size > 0 ||
			this.lines.some((line) => line.entry !== undefined && this.isProven(line));
	}

	/**
	 * Was this line accepted once? The server's own signature says so: over a place in whose history it stood, or,
	 * for a line the server wrote, over the line itself.
	 */
	isProven(line: Line): boolean {
		if (line.entry.build !== this.build) return false;
		if (this.#proven.has(line.hash)) return true;
		const { device, publicKey } = this.#key;
		return line.entry.device === device && this.sealOf(line, publicKey) !== undefined;
	}

	/** The key a device brings along, for devices that are not enrolled. The server's own is always known. */
	keyOf(device: string): string | undefined {
		return device === this.#key.device ? this.#key.publicKey : this.#keys.get(device);
	}

	sealOf(line: Line, key: string) {
		const state = this.#seals.of(line.entry.device, key, line.hash);
		return typeof state === 'string' ? undefined : state.seal;
	}

	sealRefusal(line: Line, key: string): 'seal.broken' | 'seal.missing' {
		const state = this.#seals.of(line.entry.device, key, line.hash);
		return state === 'broken' ? 'seal.broken' : 'seal.missing';
	}

	/** The line with which this build begins, when the push holds it and the actor may begin the build with it. */
	opening(actor: string): Line | undefined {
		const line = this.lines.find(
			(offered) => offered.entry?.kind === 'build.opened' && offered.entry.build === this.build
		);
		if (line?.entry === undefined) return undefined;
		const key = this.keyOf(line.entry.device);
		if (key === undefined || this.sealOf(line, key) === undefined) return undefined;
		return line.entry.author === actor || this.isProven(line) ? line : undefined;
	}
}

/** The hashes in those proofs that hold: the rows lead to a place that this server once signed. */
function provenHashes(key: ServerKey, build: string, proofs: readonly Proof[]): Set<string> {
	const proven = new Set<string>();
	for (const { after, rows, signature } of proofs) {
		let place: Place = after;
		try {
			for (const [received, hash] of rows)
				place = next(place, { seq: place.seq + 1, received, hash });
		} catch {
			// A link or hash that is not 32 bytes proves nothing.
			continue;
		}
		if (isSignedBy(key.publicKey, placeStatement(build, place), signature))
			for (const [, hash] of rows) proven.add(hash);
	}
	return proven;
}
