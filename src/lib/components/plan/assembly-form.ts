/** Between what is typed into the form of an assembly and the lines it becomes. Pure. */
import * as z from 'zod/mini';
import type { Assembly } from '$lib/logbook/fold/build';
import type { Body } from '$lib/logbook/kinds';
import { FormReader, type Errors } from '../frame/form-reader';

const ASSEMBLY_INPUTS = ['name', 'order', 'drawing', 'note'] as const;
type Input = (typeof ASSEMBLY_INPUTS)[number];
/** The form as text, nothing read yet. */
export type AssemblyTyped = Record<Input, string>;

const typedText = z.string().check(z.maxLength(4000));
const Typed = z.object({ name: typedText, order: typedText, drawing: typedText, note: typedText });
/** What is kept of a form that is not saved yet. */
export const AssemblyDraft = z.object({
	typed: Typed,
	opened: z.object({ typed: Typed, heads: z.record(z.string(), z.array(z.string())) })
});

/** Per field the lines that state it: what a change of it stands on. */
export function assemblyHeads({ fields }: Pick<Assembly, 'fields'>): Record<string, string[]> {
	return Object.fromEntries(
		[...fields].map(([name, { heads }]) => [name, heads.map(({ line }) => line)])
	);
}

export function emptyAssembly(order: number): AssemblyTyped {
	return { name: '', order: String(order), drawing: '', note: '' };
}

export function assemblyTyped({ fields }: Pick<Assembly, 'fields'>): AssemblyTyped {
	const text = (name: Input) =>
		String((fields.get(name)?.value as string | number | undefined) ?? '');
	return {
		name: text('name'),
		order: text('order'),
		drawing: text('drawing'),
		note: text('note')
	};
}

export type AssemblyRead =
	| { readonly ok: true; readonly body: Body<'assembly.planned'> }
	| { readonly ok: false; readonly errors: Errors };

export function readAssembly(typed: AssemblyTyped): AssemblyRead {
	const read = new FormReader();
	const name = read.required('name', typed.name, 120, 'Give it a name, like “Left elevator”.');
	const order = read.wholeOrNone('order', typed.order, 0, 1_000_000_000);
	const drawing = read.text('drawing', typed.drawing, 80);
	const note = read.text('note', typed.note, 2000);
	if (name === undefined || Object.keys(read.errors).length > 0)
		return { ok: false, errors: read.errors };
	return {
		ok: true,
		body: {
			name,
			...(order !== undefined && { order }),
			...(drawing !== undefined && { drawing }),
			...(note !== undefined && { note })
		}
	};
}

/** The inputs in which two versions of the form differ. */
export function changedInputs(before: AssemblyTyped, after: AssemblyTyped): Input[] {
	return ASSEMBLY_INPUTS.filter((input) => before[input].trim() !== after[input].trim());
}

/** Only the fields named; null empties one. Undefined when none is named. */
export function changedAssembly(
	body: Body<'assembly.planned'>,
	inputs: readonly Input[]
): Body<'assembly.changed'> | undefined {
	if (inputs.length === 0) return undefined;
	return Object.fromEntries(inputs.map((input) => [input, body[input] ?? null]));
}
