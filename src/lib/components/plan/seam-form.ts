/**
 * Between what is typed into the form of a seam and the lines it becomes. Pure: the form shows, this decides.
 * A new seam is `seam.planned`; a change is `seam.changed` with only the fields that were changed.
 */
import * as z from 'zod/mini';
import { rangesOf, type Seam } from '$lib/logbook/fold/seam';
import type { Body, Length, SeamOverride, Sheet } from '$lib/logbook/kinds';
import { MOST_HOLES } from '$lib/logbook/scalars';
import { formatLength } from '$lib/rivet/length';
import { FormReader, type Errors } from '../frame/form-reader';
import { holesNumbered, numbersOf, plannedHoles, type Numbered } from './hole-numbers';
import { bodyOf, openedWith, type FormOf, type Opened } from './opened';

const typedText = z.string().check(z.maxLength(4000));
const SheetTyped = z.object({
	thickness: typedText,
	material: typedText,
	prep: z.enum(['plain', 'dimple', 'countersunk', 'countersunk_under_dimple', 'double_flush']),
	part: typedText
});
const RangeTyped = z.object({
	/** The id of the override, which is a field of its own. */
	id: z.string(),
	holes: typedText,
	callout: typedText,
	method: typedText,
	leaveOpen: typedText,
	note: typedText,
	sheets: z.array(SheetTyped)
});
export const SeamTyped = z.object({
	name: typedText,
	assembly: typedText,
	order: typedText,
	callout: typedText,
	sheets: z.array(SheetTyped),
	method: typedText,
	head: typedText,
	count: typedText,
	first: typedText,
	pattern: typedText,
	rows: typedText,
	perRow: typedText,
	layout: typedText,
	numbering: typedText,
	pitch: typedText,
	rowSpacing: typedText,
	edge: typedText,
	endOne: typedText,
	endLast: typedText,
	drawing: typedText,
	sheet: typedText,
	step: typedText,
	revision: typedText,
	people: typedText,
	sealing: typedText,
	closes: z.boolean(),
	note: typedText,
	ranges: z.array(RangeTyped)
});
export type SheetTyped = z.output<typeof SheetTyped>;
export type RangeTyped = z.output<typeof RangeTyped>;
/** What is kept of a form that is not saved yet. */
export const SeamDraft = z.object({
	typed: SeamTyped,
	opened: z.optional(
		z.object({ typed: SeamTyped, heads: z.record(z.string(), z.array(z.string())) })
	)
});
/** The form as text, nothing read yet. */
export type SeamTyped = z.output<typeof SeamTyped>;

type Planned = Body<'seam.planned'>;
type Stated = Exclude<keyof Planned, 'name' | 'assembly' | 'holes' | 'overrides' | 'points'>;
/** The fields of the body that a form states; undefined where it was left empty. */
export type PlanValues = Readonly<Record<'name' | 'assembly', string>> & {
	readonly [K in Stated]: Planned[K] | undefined;
} & {
	readonly overrides: ReadonlyMap<string, SeamOverride>;
};

export function emptySeam(assembly: string, order: number): SeamTyped {
	return {
		name: '',
		assembly,
		order: String(order),
		callout: '',
		sheets: [emptySheet(), emptySheet()],
		method: 'driven',
		head: '',
		count: '',
		first: '1',
		pattern: 'row',
		rows: '1',
		perRow: '',
		layout: 'parallel',
		numbering: 'row_by_row',
		pitch: '',
		rowSpacing: '',
		edge: '',
		endOne: '',
		endLast: '',
		drawing: '',
		sheet: '',
		step: '',
		revision: '',
		people: '1',
		sealing: 'dry',
		closes: false,
		note: '',
		ranges: []
	};
}

export function emptySheet(): SheetTyped {
	return { thickness: '', material: '', prep: 'plain', part: '' };
}

export function emptyRange(id: string): RangeTyped {
	return { id, holes: '', callout: '', method: '', leaveOpen: '', note: '', sheets: [] };
}

/** The form for the seam after this one: what neighbours share stays, what is its own is emptied. */
export function nextSeam(typed: SeamTyped): SeamTyped {
	const order = Number(typed.order);
	return {
		...typed,
		name: '',
		count: '',
		perRow: '',
		note: '',
		ranges: [],
		closes: false,
		order: Number.isSafeInteger(order) && typed.order.trim() !== '' ? String(order + 1) : ''
	};
}

/** A planned seam as text, the way it would have been typed. */
export function typedOf(seam: Seam): SeamTyped {
	const { fields } = seam;
	const value = (name: string) => fields.get(name)?.value;
	const text = (name: string) => String((value(name) as string | number | undefined) ?? '');
	const length = (name: string) => {
		const stated = value(name) as Length | undefined;
		return stated ? formatLength(stated) : '';
	};
	const own = seam.holes.filter((hole) => hole.by === undefined && hole.number !== undefined);
	return {
		name: text('name'),
		assembly: text('assembly'),
		order: text('order'),
		callout: text('callout'),
		sheets: ((value('stack') as readonly Sheet[] | undefined) ?? []).map(sheetTyped),
		method: text('method'),
		head: text('head'),
		count: String(own.length),
		first: String(own[0]?.number ?? 1),
		pattern: text('pattern') || 'row',
		rows: text('rows') || '1',
		perRow: ((value('perRow') as readonly number[] | undefined) ?? []).join(', '),
		layout: text('layout') || 'parallel',
		numbering: text('numbering') || 'row_by_row',
		pitch: length('pitch'),
		rowSpacing: length('rowSpacing'),
		edge: length('edge'),
		endOne: text('endOne'),
		endLast: text('endLast'),
		drawing: text('drawing'),
		sheet: text('sheet'),
		step: text('step'),
		revision: text('revision'),
		people: text('people') || '1',
		sealing: text('sealing') || 'dry',
		closes: value('closes') === true,
		note: text('note'),
		ranges: seam.overrides.map(([id, override]) => ({
			id,
			holes: numbersOf(override.holes, seam.holes),
			callout: override.callout ?? '',
			method: override.method ?? '',
			leaveOpen: override.leaveOpen ?? '',
			note: override.note ?? '',
			sheets: (override.stack ?? []).map(sheetTyped)
		}))
	};
}

function sheetTyped({ thickness, material, prep, part }: Sheet): SheetTyped {
	return {
		thickness: formatLength(thickness),
		material: material ?? '',
		prep,
		part: part ?? ''
	};
}

export type SeamRead =
	| {
			readonly ok: true;
			readonly values: PlanValues;
			readonly holes: { readonly count: number; readonly first: number };
	  }
	/** By field, also `sheets.0.thickness` or `ranges.1.holes`. */
	| { readonly ok: false; readonly errors: Errors };

/**
 * Reads the form.
 * @param units of a number typed without one
 * @param holes of the planned seam; for a new one they follow from count and first
 */
export function readSeam(
	typed: SeamTyped,
	units: 'in' | 'mm',
	holes?: readonly Numbered[]
): SeamRead {
	const read = new FormReader(units);
	const name = read.required(
		'name',
		typed.name,
		120,
		'Give the seam a name, like “Skin to spar, lower”.'
	);
	const assembly = typed.assembly;
	if (assembly === '') read.refuse('assembly', 'Choose the assembly it belongs to.');
	const count = holes
		? holes.filter(({ by }) => by === undefined).length
		: read.whole('count', typed.count, 1, MOST_HOLES, 'How many holes does it have?');
	const first = holes
		? 1
		: read.whole('first', typed.first, 0, 1_000_000, 'The number of the first hole.');

	const several = typed.pattern === 'rows';
	const rows = several ? read.whole('rows', typed.rows, 1, 50, 'How many rows?') : undefined;
	const perRow = several ? read.wholes('perRow', typed.perRow, 1, MOST_HOLES) : undefined;
	if (perRow && rows !== undefined && perRow.length !== rows)
		read.refuse('perRow', `These are ${perRow.length} rows, and above stands ${rows}.`);
	else if (perRow && count !== undefined) {
		const sum = perRow.reduce((total, holes) => total + holes, 0);
		if (sum !== count)
			read.refuse('perRow', `These add up to ${sum}; the seam has ${count} holes.`);
	}

	const named = holes ?? plannedHoles(count ?? 0, first ?? 1);
	const overrides = new Map<string, SeamOverride>();
	typed.ranges.forEach((range, i) => {
		const at = `ranges.${i}`;
		const found = holesNumbered(range.holes, named);
		if (!found.ok) {
			// Without a count every number would be called wrong.
			if (count !== undefined) read.refuse(`${at}.holes`, found.says);
			return;
		}
		const callout = read.text(`${at}.callout`, range.callout, 64);
		const leaveOpen = read.text(`${at}.leaveOpen`, range.leaveOpen, 200);
		const note = read.text(`${at}.note`, range.note, 200);
		const stack = readStack(read, `${at}.`, range.sheets);
		const method = chosen(range.method, CHOICES.method);
		overrides.set(range.id, {
			holes: rangesOf(found.holes),
			...(callout !== undefined && { callout }),
			...(stack && { stack }),
			...(method && { method }),
			...(leaveOpen !== undefined && { leaveOpen }),
			...(note !== undefined && { note })
		});
	});

	const values: PlanValues = {
		name: name ?? '',
		assembly,
		order: read.wholeOrNone('order', typed.order, 0, 1_000_000_000),
		callout: read.text('callout', typed.callout, 64),
		stack: readStack(read, '', typed.sheets),
		method: chosen(typed.method, CHOICES.method),
		head: chosen(typed.head, CHOICES.head),
		pattern: chosen(typed.pattern, CHOICES.pattern),
		rows,
		perRow,
		layout: several ? chosen(typed.layout, CHOICES.layout) : undefined,
		numbering: several ? chosen(typed.numbering, CHOICES.numbering) : undefined,
		pitch: read.length('pitch', typed.pitch),
		rowSpacing: several ? read.length('rowSpacing', typed.rowSpacing) : undefined,
		edge: read.length('edge', typed.edge),
		endOne: read.text('endOne', typed.endOne, 40),
		endLast: read.text('endLast', typed.endLast, 40),
		drawing: read.text('drawing', typed.drawing, 80),
		sheet: read.text('sheet', typed.sheet, 40),
		step: read.text('step', typed.step, 40),
		revision: read.text('revision', typed.revision, 40),
		people: typed.people === '2' ? 2 : 1,
		sealing: typed.sealing === 'wet' ? 'wet' : 'dry',
		closes: typed.closes,
		note: read.text('note', typed.note, 2000),
		overrides
	};
	return Object.keys(read.errors).length > 0
		? { ok: false, errors: read.errors }
		: { ok: true, values, holes: { count: count ?? 1, first: first ?? 1 } };
}

/** What a select says; anything else, as '' or what an older app kept, is "not said". */
function chosen<T extends string>(value: string, of: readonly T[]): T | undefined {
	return of.find((option) => option === value);
}

const CHOICES = {
	method: ['driven', 'squeezed', 'back_riveted', 'pulled', 'screw', 'bolt'],
	head: ['near', 'far'],
	pattern: ['row', 'rows', 'free', 'nutplates'],
	layout: ['parallel', 'staggered'],
	numbering: ['row_by_row', 'back_and_forth', 'across']
} as const;

/** Sheets in order from the manufactured head; rows left wholly empty are none. */
function readStack(
	read: FormReader,
	of: string,
	sheets: readonly SheetTyped[]
): Sheet[] | undefined {
	const stack: Sheet[] = [];
	sheets.forEach((sheet, i) => {
		const at = `${of}sheets.${i}`;
		if (isBlank(sheet)) return;
		const thickness = read.length(`${at}.thickness`, sheet.thickness);
		if (sheet.thickness.trim() === '')
			read.refuse(`${at}.thickness`, 'Write how thick the sheet is, like .032.');
		const material = read.text(`${at}.material`, sheet.material, 32);
		const part = read.text(`${at}.part`, sheet.part, 80);
		if (thickness)
			stack.push({
				thickness,
				...(material !== undefined && { material }),
				prep: sheet.prep,
				...(part !== undefined && { part })
			});
	});
	return stack.length > 0 ? stack : undefined;
}

function isBlank({ thickness, material, part, prep }: SheetTyped): boolean {
	return [thickness, material, part].every((text) => text.trim() === '') && prep === 'plain';
}

export function plannedBody(
	values: PlanValues,
	holes: { readonly count: number; readonly first: number }
): Body<'seam.planned'> {
	const { overrides, name, assembly, ...rest } = values;
	return {
		...(Object.fromEntries(
			Object.entries(rest).filter(([, value]) => value !== undefined)
		) as Partial<Body<'seam.planned'>>),
		name,
		assembly,
		holes,
		...(overrides.size > 0 && { overrides: Object.fromEntries(overrides) })
	};
}

export const SEAM_FORM: FormOf<SeamTyped> = {
	named: { sheets: 'stack' },
	lists: { ranges: 'overrides' },
	// Holes are added and retired.
	fixed: ['count', 'first'],
	// Only several rows have a spacing, a layout and a way to number.
	effective: (typed) => {
		if (typed.pattern === 'rows') return typed;
		const { rows, perRow, layout, numbering, rowSpacing } = emptySeam('', 0);
		return { ...typed, rows, perRow, layout, numbering, rowSpacing };
	}
};

export function openedSeam(seam: Seam): Opened<SeamTyped> {
	return openedWith(typedOf(seam), seam.fields);
}

/** Only the fields named; null empties one. */
export function changedBody(values: PlanValues, fields: readonly string[]): Body<'seam.changed'> {
	return bodyOf<'seam.changed'>(fields, (field) =>
		field.startsWith('overrides.')
			? values.overrides.get(field.slice('overrides.'.length))
			: values[field as keyof PlanValues]
	);
}
