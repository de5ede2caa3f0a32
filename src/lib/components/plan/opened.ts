/**
 * A form of something that is planned, while others may change the same thing: which fields were changed in it, what a
 * change stands on, what comes in from others, and the line that settles a field stated twice. Pure.
 */
import type { Field } from '$lib/logbook/fold/fields';
import type { Body } from '$lib/logbook/kinds';

/** A form as it was opened: its text, and per field the lines that stated it then. */
export interface Opened<T> {
	readonly typed: T;
	readonly heads: Readonly<Record<string, readonly string[]>>;
}

/** How the inputs of a form and the fields of the plan belong together. */
export interface FormOf<T> {
	/** Fields that are called otherwise than their input. */
	readonly named?: Readonly<Partial<Record<keyof T, string>>>;
	/** Inputs that are lists whose members have an id: each member is a field of its own, `map.id`. */
	readonly lists?: Readonly<Partial<Record<keyof T, string>>>;
	/** Inputs that no line about the plan changes. */
	readonly fixed?: readonly (keyof T)[];
	/** The form without what it hides. */
	readonly effective?: (typed: T) => T;
}

type Member = { readonly id: string };
type Plan = 'seam.changed' | 'assembly.changed' | 'build.described';

export function openedWith<T>(typed: T, fields: ReadonlyMap<string, Field>): Opened<T> {
	const heads = [...fields].map(
		([name, field]) => [name, field.heads.map(({ line }) => line)] as const
	);
	return { typed, heads: Object.fromEntries(heads) };
}

/** Names of the fields in which two versions of a form differ. */
export function changedFields<T extends object>(form: FormOf<T>, opened: T, typed: T): string[] {
	const { effective = (same: T) => same } = form;
	const [before, after] = [effective(opened), effective(typed)];
	const changed: string[] = [];
	for (const input of Object.keys(after) as (keyof T & string)[]) {
		if (form.fixed?.includes(input)) continue;
		const map = form.lists?.[input];
		if (map === undefined) {
			if (!alike(before[input], after[input])) changed.push(form.named?.[input] ?? input);
			continue;
		}
		const [then, now] = [before[input], after[input]] as [readonly Member[], readonly Member[]];
		for (const id of new Set([...then, ...now].map((member) => member.id)))
			if (!alike(then.find(is(id)), now.find(is(id)))) changed.push(`${map}.${id}`);
	}
	return changed;
}

/** The lines that stated these fields when the form was opened: what a change of them stands on. */
export function headsOfFields<T>(
	{ heads }: Pick<Opened<T>, 'heads'>,
	names: readonly string[]
): string[] {
	return [...new Set(names.flatMap((name) => heads[name] ?? []))].sort();
}

/**
 * Takes over what others changed while the form was open, but never what is being typed: a field changed on both sides
 * stays as typed and stands in `both`. Saved, it stands on what this person saw, so both values are shown.
 */
export function follow<T extends object>(
	form: FormOf<T>,
	opened: Opened<T>,
	typed: T,
	now: Opened<T>
): { readonly opened: Opened<T>; readonly typed: T; readonly both: readonly string[] } {
	const names = new Set([...Object.keys(opened.heads), ...Object.keys(now.heads)]);
	const moved = [...names].filter((name) => !alike(opened.heads[name], now.heads[name]));
	const mine = new Set(changedFields(form, opened.typed, typed));
	const both = moved.filter((name) => mine.has(name));
	const theirs = moved.filter((name) => !mine.has(name));
	if (theirs.length === 0) return { opened, typed, both };
	const heads = Object.fromEntries(
		[...names].map((name) => [name, (both.includes(name) ? opened : now).heads[name] ?? []])
	);
	return {
		opened: { typed: overlaid(form, opened.typed, now.typed, theirs), heads },
		typed: overlaid(form, typed, now.typed, theirs),
		both
	};
}

/** `typed` with the inputs of some fields as they are in `from`. */
function overlaid<T extends object>(
	form: FormOf<T>,
	typed: T,
	from: T,
	fields: readonly string[]
): T {
	const inputOf = (names: object = {}, field: string) =>
		(Object.entries(names) as [keyof T, string][]).find(([, name]) => name === field)?.[0];
	let result = typed;
	for (const field of fields) {
		const [map, id] = parted(field);
		const list = id === undefined ? undefined : inputOf(form.lists, map);
		if (list !== undefined) {
			const others = (result[list] as readonly Member[]).filter((member) => member.id !== id);
			const theirs = (from[list] as readonly Member[]).filter((member) => member.id === id);
			const members = [...others, ...theirs].sort((a, b) => (a.id < b.id ? -1 : 1));
			result = { ...result, [list]: members };
			continue;
		}
		const input = inputOf(form.named, field) ?? (field as keyof T);
		if (input in from) result = { ...result, [input]: from[input] };
	}
	return result;
}

/** The body of a line that states these fields and no others; null empties one. */
export function bodyOf<K extends Plan>(
	fields: readonly string[],
	value: (field: string) => unknown
): Body<K> {
	const body: Record<string, unknown> = {};
	for (const field of fields) {
		const [map, id] = parted(field);
		if (id === undefined) body[field] = value(field) ?? null;
		else body[map] = { ...(body[map] as object | undefined), [id]: value(field) ?? null };
	}
	return body as Body<K>;
}

/** What settles a field stated twice: the value of one of its lines, and all of them to stand on. */
export function settlement<K extends Plan>(
	fields: ReadonlyMap<string, Field>,
	field: string,
	line: string
): { readonly body: Body<K>; readonly on: readonly string[] } {
	const heads = fields.get(field)?.heads ?? [];
	return {
		body: bodyOf<K>([field], () => heads.find((head) => head.line === line)?.value),
		on: heads.map((head) => head.line)
	};
}

/** `steps.<id>` is a member of a map; the rest of its name may hold dots. */
function parted(field: string): [map: string, id: string | undefined] {
	const dot = field.indexOf('.');
	return dot < 0 ? [field, undefined] : [field.slice(0, dot), field.slice(dot + 1)];
}

function is(id: string): (member: Member) => boolean {
	return (member) => member.id === id;
}

function alike(a: unknown, b: unknown): boolean {
	return trimmed(a) === trimmed(b);
}
function trimmed(value: unknown): string {
	return JSON.stringify(value, (_, inner: unknown) =>
		typeof inner === 'string' ? inner.trim() : inner
	);
}
