/** Between what is typed into the form of an assembly and the lines it becomes. Pure. */
import * as z from 'zod/mini';
import type { Assembly } from '$lib/logbook/fold/build';
import type { Body } from '$lib/logbook/kinds';
import { FormReader, type Errors } from '../frame/form-reader';
import { bodyOf, openedWith, type FormOf, type Opened } from './opened';

const typedText = z.string().check(z.maxLength(4000));
const StepTyped = z.object({
	/** The id of the step, which is a field of its own. */
	id: z.string(),
	text: typedText,
	order: typedText,
	/** What is written down when it is done: nothing, a text or a number. */
	value: z.enum(['', 'text', 'number']),
	unit: typedText,
	drawing: typedText
});
const AssemblyTyped = z.object({
	name: typedText,
	order: typedText,
	outline: typedText,
	drawing: typedText,
	note: typedText,
	steps: z.array(StepTyped)
});
/** A step of the plan that is no rivet. */
export type PlannedStep = NonNullable<Body<'assembly.planned'>['steps']>[string];
export type StepTyped = z.output<typeof StepTyped>;
/** The form as text, nothing read yet. */
export type AssemblyTyped = z.output<typeof AssemblyTyped>;
/** What is kept of a form that is not saved yet. */
export const AssemblyDraft = z.object({
	typed: AssemblyTyped,
	opened: z.optional(
		z.object({ typed: AssemblyTyped, heads: z.record(z.string(), z.array(z.string())) })
	)
});

export const ASSEMBLY_FORM: FormOf<AssemblyTyped> = { lists: { steps: 'steps' } };

export function emptyAssembly(order: number): AssemblyTyped {
	return { name: '', order: String(order), outline: '', drawing: '', note: '', steps: [] };
}

export function emptyStep(id: string): StepTyped {
	return { id, text: '', order: '', value: '', unit: '', drawing: '' };
}

type Planned = Pick<Assembly, 'fields' | 'steps'>;

/** A planned assembly as text, the way it would have been typed. */
export function typedAssembly({ fields, steps }: Planned): AssemblyTyped {
	const text = (name: string) =>
		String((fields.get(name)?.value as string | number | undefined) ?? '');
	return {
		name: text('name'),
		order: text('order'),
		outline: text('outline'),
		drawing: text('drawing'),
		note: text('note'),
		steps: steps.map(([id, step]) => {
			const { text, order = '', value = '', unit = '', drawing = '' } = step as PlannedStep;
			return { id, text, order: String(order), value, unit, drawing };
		})
	};
}

export function openedAssembly(assembly: Planned): Opened<AssemblyTyped> {
	return openedWith(typedAssembly(assembly), assembly.fields);
}

export type AssemblyRead =
	| { readonly ok: true; readonly body: Body<'assembly.planned'> }
	/** By field, also `steps.0.text`. */
	| { readonly ok: false; readonly errors: Errors };

export function readAssembly(typed: AssemblyTyped): AssemblyRead {
	const read = new FormReader();
	const name = read.required('name', typed.name, 120, 'Give it a name, like “Left elevator”.');
	const order = read.wholeOrNone('order', typed.order, 0, 1_000_000_000);
	const outline = read.text('outline', typed.outline, 32);
	const drawing = read.text('drawing', typed.drawing, 80);
	const note = read.text('note', typed.note, 2000);
	const steps = typed.steps.map(
		(step, i) => [step.id, readStep(read, `steps.${i}`, step)] as const
	);
	if (name === undefined || Object.keys(read.errors).length > 0)
		return { ok: false, errors: read.errors };
	return {
		ok: true,
		body: {
			name,
			...(order !== undefined && { order }),
			...(outline !== undefined && { outline }),
			...(drawing !== undefined && { drawing }),
			...(note !== undefined && { note }),
			...(steps.length > 0 && { steps: Object.fromEntries(steps) })
		}
	};
}

function readStep(read: FormReader, at: string, step: StepTyped): PlannedStep {
	const text = read.required(
		`${at}.text`,
		step.text,
		400,
		'Say what is to be done, like “torque the hinge bolts”, or take the step out.'
	);
	const order = read.wholeOrNone(`${at}.order`, step.order, 0, 1_000_000_000);
	// Only a number has a unit.
	const unit = step.value === 'number' ? read.text(`${at}.unit`, step.unit, 16) : undefined;
	const drawing = read.text(`${at}.drawing`, step.drawing, 80);
	return {
		text: text ?? '',
		...(order !== undefined && { order }),
		...(step.value !== '' && { value: step.value }),
		...(unit !== undefined && { unit }),
		...(drawing !== undefined && { drawing })
	};
}

/** Only the fields named; null empties one. */
export function changedAssembly(
	body: Body<'assembly.planned'>,
	fields: readonly string[]
): Body<'assembly.changed'> {
	return bodyOf<'assembly.changed'>(fields, (field) =>
		field.startsWith('steps.')
			? body.steps?.[field.slice('steps.'.length)]
			: body[field as keyof typeof body]
	);
}
