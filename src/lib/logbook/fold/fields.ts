/** Fields of a plan: each key of a body, and each member of `overrides`, `steps` and `rules`, is one. */
import { gather } from './gather';
import { headsOf } from './heads';
import type { Line } from './line';

export interface Field {
	/** What to show: the value of the last head in order, a default while heads differ. Undefined when emptied. */
	readonly value: unknown;
	/** The lines that state it. More than one, with different values: both are shown. */
	readonly heads: readonly { readonly line: string; readonly value: unknown }[];
	readonly differs: boolean;
}

const MAPS = new Set(['overrides', 'steps', 'rules']);

/** The fields a body states. A member of a map is the field `map.key`. */
function stated(body: Readonly<Record<string, unknown>>, skip?: string): [string, unknown][] {
	return Object.entries(body).flatMap(([key, value]): [string, unknown][] => {
		if (key === skip) return [];
		if (!MAPS.has(key)) return [[key, value]];
		return Object.entries(value as Record<string, unknown>).map(([inner, member]) => [
			`${key}.${inner}`,
			member
		]);
	});
}

/** @param lines the plan lines of one thing, in order */
export function fieldsOf(
	lines: readonly Line[],
	isStruck: (id: string) => boolean,
	skip?: string
): ReadonlyMap<string, Field> {
	const claims = new Map<string, { line: Line; value: unknown }[]>();
	for (const line of lines)
		for (const [field, value] of stated(line.entry?.body ?? {}, skip))
			gather(claims, field, { line, value });
	const fields = new Map<string, Field>();
	for (const [name, list] of claims) {
		const values = new Map(list.map(({ line, value }) => [line.id, value ?? undefined]));
		const heads = headsOf(
			list.map(({ line }) => line),
			isStruck
		).map((line) => ({ line: line.id, value: values.get(line.id) }));
		if (heads.length === 0) continue;
		const texts = new Set(heads.map(({ value }) => JSON.stringify(value ?? null)));
		fields.set(name, { value: heads.at(-1)?.value, heads, differs: texts.size > 1 });
	}
	return fields;
}

/** The members of a map field, in order of their ids, without the emptied ones. */
export function members(fields: ReadonlyMap<string, Field>, map: string): [string, unknown][] {
	return [...fields]
		.filter(([name, field]) => name.startsWith(`${map}.`) && field.value !== undefined)
		.map(([name, field]): [string, unknown] => [name.slice(map.length + 1), field.value])
		.sort(([a], [b]) => (a < b ? -1 : 1));
}
