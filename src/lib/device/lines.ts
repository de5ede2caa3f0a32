/** From stored rows to the lines that folds take, and the copy of them in memory that spares a tap the reading. */
import * as z from 'zod/mini';
import { readEntry, type Entry, type Envelope } from '$lib/logbook/entry';
import { lineOf, type Line } from '$lib/logbook/fold/line';
import { traits } from '$lib/logbook/kinds';
import { Id, WallTime, When } from '$lib/logbook/scalars';
import type { EntryRow } from './schema';

/** A row as a fold sees it; undefined for text that cannot even be placed. */
export function lineOfRow(row: EntryRow): Line | undefined {
	if (row.withdrawn) {
		const envelope = envelopeOf(row.withdrawn.envelope);
		return envelope && { id: row.id, envelope, unreadable: 'withdrawn' };
	}
	if (row.sound) {
		// Judged when it was stored, and its bytes have not changed since.
		const entry = JSON.parse(row.text) as Entry;
		if (traits(entry.kind, entry.v)) return { id: row.id, envelope: entry, entry };
	}
	return lineOf(readEntry(row.text));
}

const WithdrawnEnvelope = z.object({
	id: Id,
	build: Id,
	kind: z.string(),
	v: z.int(),
	seam: z.optional(Id),
	assembly: z.optional(Id),
	on: z.array(Id),
	n: z.int(),
	device: Id,
	author: Id,
	at: WallTime,
	when: z.optional(When)
});

/** The envelope of a withdrawn line, as the server tells it: the line without its body. */
export function envelopeOf(text: string): Omit<Envelope, 'body'> | undefined {
	try {
		const envelope = WithdrawnEnvelope.safeParse(JSON.parse(text));
		return envelope.success ? envelope.data : undefined;
	} catch {
		return undefined;
	}
}

/** The lines of a part, without those that do not count. */
export function countedLines(rows: readonly EntryRow[]): Line[] {
	const lines: Line[] = [];
	for (const row of rows) {
		if (row.excluded) continue;
		const line = lineOfRow(row);
		if (line) lines.push(line);
	}
	return lines;
}

/** Lines kept in memory over all builds; about 1 kB each. */
const MOST_CACHED = 30_000;

/**
 * The lines of the parts used last. What must hold: lines are only used when the build's `changes` counter, read in the
 * same transaction, is the one they were read at. Otherwise a summary would miss what another tab wrote.
 */
export class LineCache {
	readonly #builds = new Map<string, { changes: number; parts: Map<string, Line[]> }>();
	#held = 0;

	/** The lines of a part as of `changes`, or undefined when they must be read. */
	get(build: string, changes: number, part: string): Line[] | undefined {
		const known = this.#builds.get(build);
		if (!known) return undefined;
		if (known.changes !== changes) {
			this.forget(build);
			return undefined;
		}
		const lines = known.parts.get(part);
		if (lines) {
			// Last used, last thrown out.
			known.parts.delete(part);
			known.parts.set(part, lines);
		}
		return lines;
	}

	/** Takes over what a committed transaction saw: before it the counter stood at `before`, now at `after`. */
	set(
		build: string,
		before: number,
		after: number,
		parts: ReadonlyMap<string, Line[] | undefined>
	): void {
		let known = this.#builds.get(build);
		// A reading that was overtaken while it ended.
		if (known && known.changes > after) return;
		if (known && known.changes !== before && known.changes !== after) {
			this.forget(build);
			known = undefined;
		}
		if (!known) {
			known = { changes: after, parts: new Map() };
			this.#builds.delete(build);
			this.#builds.set(build, known);
		}
		known.changes = after;
		for (const [part, lines] of parts) {
			this.#held -= known.parts.get(part)?.length ?? 0;
			known.parts.delete(part);
			if (!lines) continue;
			known.parts.set(part, lines);
			this.#held += lines.length;
		}
		this.#trim();
	}

	forget(build: string): void {
		for (const lines of this.#builds.get(build)?.parts.values() ?? []) this.#held -= lines.length;
		this.#builds.delete(build);
	}

	#trim(): void {
		for (const { parts } of this.#builds.values()) {
			for (const [part, lines] of parts) {
				if (this.#held <= MOST_CACHED) return;
				parts.delete(part);
				this.#held -= lines.length;
			}
		}
	}
}
