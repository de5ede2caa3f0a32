/** A line of the log as the folds see it: its envelope always, its meaning where this app knows the kind. */
import { byOrder, type Entry, type Envelope, type Reading } from '../entry';

export interface Line {
	readonly id: string;
	readonly envelope: Omit<Envelope, 'body'>;
	/** Missing when the line cannot be read: a kind of a newer app, or a withdrawn body. */
	readonly entry?: Entry;
	readonly unreadable?: 'newer_app' | 'withdrawn' | 'broken';
}

/** A line from a reading; undefined for text that is no entry at all. */
export function lineOf(reading: Reading): Line | undefined {
	if (reading.ok) return { id: reading.entry.id, envelope: reading.entry, entry: reading.entry };
	if (reading.envelope)
		return { id: reading.envelope.id, envelope: reading.envelope, unreadable: 'newer_app' };
	return undefined;
}

/**
 * Lines in order, each id once. Every fold starts with this, which is why none depends on the order of arrival.
 */
export function inOrder(lines: readonly Line[]): Line[] {
	const once = new Map<string, Line>();
	for (const line of lines) {
		const there = once.get(line.id);
		// Of two tellings of one id the readable one counts, so that which came first cannot matter.
		if (!there || (!there.entry && line.entry)) once.set(line.id, line);
	}
	return [...once.values()].sort((a, b) => byOrder(a.envelope, b.envelope));
}

/** A line whose kind is one of these, narrowed. */
export function isKind<K extends Entry['kind']>(
	line: Line,
	...kinds: readonly K[]
): line is Line & { readonly entry: Extract<Entry, { kind: K }> } {
	return line.entry !== undefined && (kinds as readonly string[]).includes(line.entry.kind);
}
