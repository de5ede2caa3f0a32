/** What the plan calls things, and its values in words. */
import type { Length, Prep, SeamOverride, Sheet } from '$lib/logbook/kinds';
import { formatLength } from '$lib/rivet/length';
import { METHOD_WORDS, stamped } from '../logbook/words';
import { counted } from '../frame/numbers';
import { OUTLINE_NAMES } from '../wall/outline';
import type { PlannedStep } from './assembly-form';
import { numbersOf, type Numbered } from './hole-numbers';

type Options = readonly (readonly [value: string, words: string])[];

export const PREP_OPTIONS: readonly (readonly [Prep, string])[] = [
	['plain', 'plain'],
	['dimple', 'dimple'],
	['countersunk', 'countersunk'],
	['countersunk_under_dimple', 'countersunk under a dimple'],
	['double_flush', 'double flush']
];
export const METHOD_OPTIONS: Options = [
	['driven', 'driven'],
	['squeezed', 'squeezed'],
	['back_riveted', 'back-riveted'],
	['pulled', 'pulled (blind)'],
	['screw', 'screw'],
	['bolt', 'bolt']
];
export const PATTERN_OPTIONS: Options = [
	['row', 'one row'],
	['rows', 'several rows'],
	['free', 'free'],
	['nutplates', 'nutplates, two rivets each']
];
export const LAYOUT_OPTIONS: Options = [
	['parallel', 'side by side'],
	['staggered', 'staggered']
];
export const NUMBERING_OPTIONS: Options = [
	['row_by_row', 'row by row, each from end 1'],
	['back_and_forth', 'back and forth'],
	['across', 'across the rows']
];
export const HEAD_OPTIONS: Options = [
	['', 'not said'],
	['near', 'near side'],
	['far', 'far side']
];
/** Which part an assembly is: the outlines the wall draws. */
export const PART_OPTIONS: Options = [
	['', 'not said'],
	...OUTLINE_NAMES.map(
		(name) => [name, name === 'other' ? 'another part' : name.replaceAll('_', ' ')] as const
	)
];
export const STEP_VALUE_OPTIONS: readonly (readonly ['' | 'text' | 'number', string])[] = [
	['', 'that it was done'],
	['number', 'a number'],
	['text', 'a few words']
];

const FIELD_WORDS: Readonly<Record<string, string>> = {
	name: 'Name',
	assembly: 'Assembly',
	order: 'Order',
	about: 'What it is',
	units: 'Units',
	place: 'Place',
	outline: 'Which part',
	callout: 'Rivet',
	stack: 'Sheets',
	method: 'Method',
	head: 'Manufactured head',
	pattern: 'Pattern',
	rows: 'Rows',
	perRow: 'Holes in each row',
	layout: 'Rows lie',
	numbering: 'Numbers run',
	points: 'Places of the holes',
	pitch: 'Pitch',
	rowSpacing: 'Row spacing',
	edge: 'Edge distance',
	endOne: 'Hole 1 is at',
	endLast: 'The other end is',
	drawing: 'Drawing',
	sheet: 'Sheet',
	step: 'Step',
	revision: 'Revision',
	people: 'People',
	sealing: 'Wet or dry',
	closes: 'Closes the structure',
	note: 'Note'
};

/** Fields in the order in which the form asks for them; ranges come last. */
export function inFormOrder<T>(fields: Iterable<readonly [string, T]>): (readonly [string, T])[] {
	const places = Object.keys(FIELD_WORDS);
	const place = ([field]: readonly [string, T]) => {
		const at = places.indexOf(field);
		return at < 0 ? places.length : at;
	};
	return [...fields].sort((a, b) => place(a) - place(b));
}

/** What a field of a plan is called: `callout`, `overrides.<id>`, `steps.<id>`. */
export function fieldWords(field: string): string {
	const [map] = field.split('.');
	if (map === 'overrides') return 'A range that differs';
	if (map === 'steps') return 'A step';
	if (map === 'rules') return `Rule ${field.slice('rules.'.length)}`;
	return FIELD_WORDS[field] ?? field;
}

export interface ValueNames {
	assembly(id: string): string;
	readonly holes: readonly Numbered[];
}

/** A value of the plan as it is read aloud. */
export function valueWords(field: string, value: unknown, names: ValueNames): string {
	if (value === undefined || value === null) return 'empty';
	const [map] = field.split('.');
	if (map === 'overrides') return overrideWords(value as SeamOverride, names);
	if (map === 'steps') return stepWords(value as PlannedStep);
	switch (field) {
		case 'assembly':
			return names.assembly(value as string);
		case 'callout':
			return stamped(value as string);
		case 'stack':
			return stackWords(value as readonly Sheet[]);
		case 'pitch':
		case 'rowSpacing':
		case 'edge':
			return formatLength(value as Length);
		case 'people':
			return counted(value as number, 'person', 'people');
		case 'closes':
			return value === true ? 'yes' : 'no';
		case 'perRow':
			return (value as readonly number[]).join(', ');
		case 'points':
			return counted((value as readonly number[]).length / 2, 'place');
		case 'units':
			return value === 'mm' ? 'millimetres' : 'inches';
	}
	const words = OPTIONS_OF[field]?.find(([option]) => option === value)?.[1];
	return words ?? (typeof value === 'string' ? value : JSON.stringify(value));
}

const OPTIONS_OF: Readonly<Record<string, Options>> = {
	method: METHOD_OPTIONS,
	pattern: PATTERN_OPTIONS,
	layout: LAYOUT_OPTIONS,
	numbering: NUMBERING_OPTIONS,
	head: HEAD_OPTIONS,
	outline: PART_OPTIONS
};

function stepWords({ text, order, value, unit, drawing }: PlannedStep): string {
	return [
		text,
		value === 'number' && ['with a number', unit && `in ${unit}`].filter(Boolean).join(' '),
		value === 'text' && 'with a few words',
		drawing && `drawing ${drawing}`,
		order !== undefined && `order ${order}`
	]
		.filter(Boolean)
		.join(', ');
}

function stackWords(stack: readonly Sheet[]): string {
	return stack
		.map(({ thickness, material, prep, part }) =>
			[formatLength(thickness), material, prepWords(prep), part && `(${part})`]
				.filter(Boolean)
				.join(' ')
		)
		.join(' + ');
}

function prepWords(prep: Prep): string | undefined {
	return prep === 'plain' ? undefined : PREP_OPTIONS.find(([option]) => option === prep)?.[1];
}

function overrideWords(override: SeamOverride, { holes }: ValueNames): string {
	const { callout, stack, method, leaveOpen, note } = override;
	return [
		`holes ${numbersOf(override.holes, holes)}`,
		callout && stamped(callout),
		stack && stackWords(stack),
		method && METHOD_WORDS[method],
		leaveOpen && `left open: ${leaveOpen}`,
		note
	]
		.filter(Boolean)
		.join(', ');
}
