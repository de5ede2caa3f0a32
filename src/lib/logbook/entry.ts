/**
 * The entry: one immutable line of the logbook. The envelope is frozen; it is readable whatever the kind,
 * so that a line from a newer app can be kept, shown and passed on unharmed.
 */
import * as z from 'zod/mini';
import { canonicalText, hashText, NotCanonical, tidy, utf8, type Json } from './bytes';
import { traits, type Body, type Kind } from './kinds';
import type { OwnRefusalCode } from './own-refusals';
import { Id, WallTime, When, whole } from './scalars';

/** `on` may not name more lines than this: a run over the longest seam stands on fewer. */
const MOST_ON = 800;

/** Leaves room above every n that can be written. */
const MOST_N = 2 ** 52;

const Envelope = z.strictObject({
	id: Id,
	build: Id,
	kind: z.string().check(z.regex(/^[a-z]+\.[a-z_]+$/), z.maxLength(40)),
	v: whole(1, 1000),
	seam: z.optional(Id),
	assembly: z.optional(Id),
	on: z.array(Id).check(
		z.maxLength(MOST_ON),
		// Ascending: one set of causes has one writing.
		z.refine((ids) => ids.every((id, i) => i === 0 || (ids[i - 1] as string) < id))
	),
	n: whole(1, MOST_N),
	device: Id,
	author: Id,
	at: WallTime,
	when: z.optional(When),
	body: z.record(z.string(), z.unknown())
});

export type When = z.output<typeof When>;
/** An entry of any kind, known to this app or not. */
export type Envelope = z.output<typeof Envelope>;

type EntryOf<K extends Kind> = K extends Kind
	? Omit<Envelope, 'kind' | 'v' | 'body'> & { kind: K; v: 1; body: Body<K> }
	: never;
/** An entry of a kind this app knows; narrow it by `kind`. */
export type Entry<K extends Kind = Kind> = EntryOf<K>;

/** The most UTF-8 bytes of an entry: 32 KiB; a sign-off lists what it covers and may take 256 KiB. */
export const MOST_BYTES = 32 * 1024;
export const MOST_BYTES_SIGNED = 256 * 1024;

export type Reading =
	| { readonly ok: true; readonly entry: Entry; readonly text: string; readonly hash: string }
	/** A sound envelope of a kind or version this app does not know. */
	| {
			readonly ok: false;
			readonly code: 'entry.unknown_kind';
			readonly envelope: Envelope;
			readonly text: string;
			readonly hash: string;
	  }
	/** `id` where it could be made out, so that the answer can name it. */
	| {
			readonly ok: false;
			readonly code: OwnRefusalCode;
			readonly envelope?: undefined;
			readonly id?: string | undefined;
			readonly detail?: string;
	  };

/**
 * Reads the text of an entry as it came over the wire, out of a file or from the store. Checks everything
 * that can be known from the entry alone. Never throws.
 */
export function readEntry(text: string): Reading {
	if (isLonger(text, MOST_BYTES_SIGNED)) return { ok: false, code: 'entry.too_large' };
	let value: Json;
	try {
		value = JSON.parse(text) as Json;
		// Doubled keys, spaces, fractions, other escapes: whatever the parser forgave shows here.
		if (canonicalText(value) !== text)
			return { ok: false, code: 'entry.not_canonical', id: idOf(value) };
	} catch (error) {
		const detail = error instanceof NotCanonical ? error.message : 'not JSON';
		return { ok: false, code: 'entry.not_canonical', detail };
	}
	const envelope = Envelope.safeParse(value);
	if (!envelope.success) return fault(envelope.error, value);
	return judgeForm(envelope.data, text);
}

/** Longer than so many UTF-8 bytes? A UTF-16 unit takes three at most, so short texts need not be encoded. */
function isLonger(text: string, bytes: number): boolean {
	return text.length * 3 > bytes && utf8(text).length > bytes;
}

function judgeForm(envelope: Envelope, text: string): Reading {
	const { id, kind, v } = envelope;
	if (kind !== 'inspection.signed' && isLonger(text, MOST_BYTES))
		return { ok: false, code: 'entry.too_large', id };
	const kindTraits = traits(kind, v);
	const hash = hashText(text);
	if (!kindTraits) return { ok: false, code: 'entry.unknown_kind', envelope, text, hash };
	const body = z.safeParse(kindTraits.body, envelope.body);
	if (!body.success) return fault(body.error, envelope);
	if (!concernsFit(envelope, kindTraits.concerns)) return { ok: false, code: 'entry.concerns', id };
	if (!carriesItsIdentity(envelope)) return { ok: false, code: 'entry.identity', id };
	// Holes of the plan are named without `by`: two names for one hole would count it twice in one line.
	const entry = envelope as unknown as Entry;
	if (holesOf(entry).some((range) => range.by !== undefined && range.by === envelope.seam))
		return {
			ok: false,
			code: 'entry.malformed',
			id,
			detail: 'a hole of the plan named by its seam'
		};
	if (kind === 'entry.struck' && envelope.body['entry'] === envelope.body['keeps'])
		return { ok: false, code: 'strike.settles_itself', id };
	return { ok: true, entry, text, hash };
}

function fault(error: z.core.$ZodError, value: unknown): Reading {
	const unknownField = error.issues.some((issue) => issue.code === 'unrecognized_keys');
	const first = error.issues[0];
	return {
		ok: false,
		code: unknownField ? 'entry.unknown_field' : 'entry.malformed',
		id: idOf(value),
		detail: first ? `${first.path.join('.')}: ${first.message}` : ''
	};
}

function idOf(value: unknown): string | undefined {
	const id = (value as { id?: unknown } | null)?.id;
	return typeof id === 'string' && Id.safeParse(id).success ? id : undefined;
}

function concernsFit(envelope: Envelope, concerns: 'build' | 'assembly' | 'seam' | 'any'): boolean {
	const { seam, assembly } = envelope;
	switch (concerns) {
		case 'build':
			return seam === undefined && assembly === undefined;
		case 'assembly':
			return seam === undefined && assembly !== undefined;
		case 'seam':
			return seam !== undefined && assembly === undefined;
		case 'any':
			return seam === undefined || assembly === undefined;
	}
}

/** What a line makes is named by that line's id, so two lines can never make the same build, assembly or seam. */
function carriesItsIdentity({ id, kind, build, assembly, seam }: Envelope): boolean {
	const makes =
		kind === 'build.opened'
			? build
			: kind === 'assembly.planned'
				? assembly
				: kind === 'seam.planned'
					? seam
					: id;
	const made = [build, assembly, seam].includes(id);
	return (
		makes === id &&
		made === (kind === 'build.opened' || kind === 'assembly.planned' || kind === 'seam.planned')
	);
}

/** The text of an entry made on this device: tidied, canonical, checked like one that arrives. */
export function writeEntry(entry: Entry): Reading {
	return readEntry(canonicalText(tidy(entry)));
}

/** What an entry refers to, apart from `on`: ids that must have arrived before it can be judged. */
export function references(entry: Entry): { bound: string[]; loose: string[] } {
	const kindTraits = traits(entry.kind, entry.v);
	const body = entry.body as Readonly<Record<string, unknown>>;
	const pick = (keys: readonly string[] = []) =>
		keys.map((key) => body[key]).filter((id) => typeof id === 'string');
	const bound = pick(kindTraits?.binds);
	const loose = pick(kindTraits?.refers);
	for (const range of holesOf(entry))
		if (range.by !== undefined && !bound.includes(range.by)) bound.push(range.by);
	if (entry.kind === 'reading.taken') {
		const { what } = entry.body;
		if (what.is === 'hole' && what.by !== undefined) bound.push(what.by);
		if (what.is === 'strip') loose.push(what.strip);
	}
	if (entry.kind === 'holes.added' && entry.body.after?.by !== undefined)
		bound.push(entry.body.after.by);
	// The seam or assembly itself: a line about one that nobody planned yet waits for the plan.
	if (entry.seam !== undefined && entry.seam !== entry.id) bound.push(entry.seam);
	if (entry.assembly !== undefined && entry.assembly !== entry.id) loose.push(entry.assembly);
	if (
		(entry.kind === 'seam.planned' || entry.kind === 'seam.changed') &&
		entry.body.assembly !== undefined
	)
		loose.push(entry.body.assembly);
	return { bound, loose };
}

/** The holes an entry names, none for kinds that name none. A single-hole reading is a range of one. */
export function holesOf(entry: Entry): { by?: string | undefined; from: number; to: number }[] {
	if (entry.kind === 'reading.taken') {
		const { what } = entry.body;
		return what.is === 'hole' ? [{ by: what.by, from: what.index, to: what.index }] : [];
	}
	if (entry.kind === 'inspection.signed') return entry.body.rework ?? [];
	return 'holes' in entry.body && Array.isArray(entry.body.holes) ? entry.body.holes : [];
}

/**
 * The order for lists and defaults: n, then device, then id. It decides nothing: what stands on what does.
 * @returns negative when `a` comes first
 */
export function byOrder(
	a: Pick<Envelope, 'n' | 'device' | 'id'>,
	b: Pick<Envelope, 'n' | 'device' | 'id'>
): number {
	return a.n - b.n || compare(a.device, b.device) || compare(a.id, b.id);
}

export function compare(a: string, b: string): number {
	return a < b ? -1 : a > b ? 1 : 0;
}

/** The lines folded together: those of a seam, or (the empty name) all that concern no seam. */
export function partOf(envelope: Pick<Envelope, 'seam'>): string {
	return envelope.seam ?? '';
}
