/**
 * The fold of a seam: what is true of it, from all lines about it. A pure function of the set of lines, so every phone
 * and the server agree whatever arrived when. It never throws: nonsense becomes a finding.
 */
import { holesOf, type Entry } from '../entry';
import type { Fault, Holes, HoleRange, Method, SeamOverride, Sheet } from '../kinds';
import { traits } from '../kinds';
import { fieldsOf, members, type Field } from './fields';
import { MOST_HOLES } from '../scalars';
import { gather } from './gather';
import { headsOf } from './heads';
import { inOrder, isKind, type Line } from './line';
import { strikesOf, type Strikes } from './strikes';

/**
 * Raised with every change of what a fold says. Summaries carry it and are made again where it differs.
 */
export const FOLD_VERSION = 1;

/** The identity of a hole: who added it (empty for the plan) and its index there, from 1. */
export type HoleKey = `${string}:${number}`;
export const holeKey = (by: string | undefined, index: number): HoleKey => `${by ?? ''}:${index}`;

/** `contested`: heads of different kinds. It counts as not done until somebody writes a line that stands on all of them. */
type HoleState = 'open' | 'driven' | 'left_open' | 'drilled_out' | 'retired' | 'contested';

export interface Hole {
	readonly key: HoleKey;
	readonly by?: string;
	readonly index: number;
	/** What is written on the skin. Undefined for a hole no plan knows. */
	readonly number?: number;
	/** Row it lies in, from 1. */
	readonly row: number;
	readonly state: HoleState;
	/** Driven by two lines that did not know of each other: one rivet, and a finding. */
	readonly twice: boolean;
	/** Ids of the lines that state it. What a new line about this hole stands on. */
	readonly heads: readonly string[];
	/** In no plan (any more), yet there is a rivet in it. */
	readonly outside: boolean;
	/** Good and bad readings of the rivet that is in it now. */
	readonly good: number;
	readonly bad: number;
	readonly looked: boolean;
	readonly defects: readonly string[];
	/** What the plan says of this hole where it differs from the seam. */
	readonly override?: SeamOverride;
}

/** `decided`: what to do is decided but not done. */
type DefectState = 'open' | 'decided' | 'referred' | 'settled' | 'contested';

export interface Defect {
	readonly id: string;
	readonly fault: Fault;
	readonly note?: string;
	readonly holes: readonly {
		readonly key: HoleKey;
		readonly state: DefectState;
		readonly heads: readonly string[];
	}[];
}

export type Finding =
	| {
			readonly is: 'driven_twice' | 'noted_twice' | 'contested' | 'outside';
			readonly holes: readonly HoleKey[];
			readonly lines: readonly string[];
	  }
	| { readonly is: 'number_twice'; readonly number: number; readonly holes: readonly HoleKey[] }
	| { readonly is: 'plan_differs'; readonly field: string; readonly lines: readonly string[] }
	| {
			readonly is: 'defect_contested';
			readonly defect: string;
			readonly holes: readonly HoleKey[];
			readonly lines: readonly string[];
	  }
	/** A strike of nothing; a strike that keeps a line that is struck too; a line this app cannot read. */
	| {
			readonly is: 'idle_strike' | 'kept_is_struck' | 'unreadable';
			readonly lines: readonly string[];
	  };

export interface SeamPlan {
	readonly name: string;
	readonly assembly?: string;
	readonly callout?: string;
	readonly stack?: readonly Sheet[];
	readonly pattern: 'row' | 'rows' | 'free' | 'nutplates';
	readonly rows: number;
	readonly perRow?: readonly number[];
	readonly layout: 'parallel' | 'staggered';
	readonly numbering: 'row_by_row' | 'back_and_forth' | 'across';
	readonly endOne?: string;
	readonly endLast?: string;
	readonly order: number;
	readonly people: 1 | 2;
	readonly sealing: 'dry' | 'wet';
	readonly closes: boolean;
	readonly method?: Method;
	readonly note?: string;
}

export interface Seam {
	readonly id: string;
	/** The line that planned it has arrived. */
	readonly planned: boolean;
	readonly plan: SeamPlan;
	readonly fields: ReadonlyMap<string, Field>;
	readonly overrides: readonly (readonly [string, SeamOverride])[];
	readonly retired: boolean;
	/** Holes of the plan as they lie, then those outside it. */
	readonly holes: readonly Hole[];
	readonly defects: readonly Defect[];
	readonly findings: readonly Finding[];
	/** All lines in order, struck ones too. */
	readonly lines: readonly Line[];
	readonly struck: Strikes['struck'];
}

type HoldingLine = Line & {
	entry: Entry<'holes.driven' | 'holes.left_open' | 'holes.drilled_out' | 'holes.retired'>;
};

/** @param id of the seam, which is the id of the line that planned it */
export function foldSeam(id: string, unordered: readonly Line[]): Seam {
	const lines = inOrder(unordered);
	const { struck, idle, hollow } = strikesOf(lines);
	const isStruck = (line: string) => struck.has(line);
	const findings: Finding[] = [];

	const planLines = lines.filter((line) => isKind(line, 'seam.planned', 'seam.changed'));
	const fields = fieldsOf(planLines, isStruck, 'holes');
	const overrides = members(fields, 'overrides') as [string, SeamOverride][];
	const plan = planOf(fields);
	const layout = layOut(id, lines, isStruck, plan);

	// Per hole, everything that states, looks at or measures it.
	const claims = new Map<HoleKey, Line[]>();
	const remarks = new Map<HoleKey, Line[]>();
	for (const line of lines) {
		if (!line.entry || line.envelope.seam !== id) continue;
		const into = holds(line)
			? claims
			: isKind(line, 'holes.looked_at', 'reading.taken') && !isStruck(line.id)
				? remarks
				: undefined;
		if (into) for (const key of keysOf(id, holesOf(line.entry))) gather(into, key, line);
	}
	const defects = defectsOf(id, lines, isStruck);
	const defectsAt = new Map<HoleKey, string[]>();
	for (const defect of defects)
		for (const { key, state } of defect.holes)
			if (state !== 'settled') gather(defectsAt, key, defect.id);

	const overrideAt = new Map<HoleKey, SeamOverride>();
	for (const [, override] of overrides)
		for (const key of keysOf(id, override.holes)) overrideAt.set(key, override);

	const places: Place[] = [...layout.values()];
	for (const key of claims.keys()) if (!layout.has(key)) places.push(strayPlace(key));

	const holes: Hole[] = [];
	for (const place of places) {
		const stating = claims.get(place.key) ?? [];
		const heads = headsOf(stating, isStruck) as HoldingLine[];
		if (place.number === undefined && heads.length === 0) continue;
		const state = stateOf(heads);
		const head = heads[0]?.id;
		const about = remarks
			.get(place.key)
			?.filter((line) => heads.some(({ id: on }) => line.envelope.on.includes(on)));
		const verdicts = (about ?? []).map((line) =>
			isKind(line, 'reading.taken') ? isInside(line.entry) : undefined
		);
		const override = overrideAt.get(place.key);
		holes.push({
			...place,
			state,
			twice: state === 'driven' && heads.length > 1,
			heads: heads.map((line) => line.id),
			outside:
				(place.number === undefined || state === 'retired') &&
				hasRivet(state, stating, isStruck, head),
			good: verdicts.filter((inside) => inside === true).length,
			bad: verdicts.filter((inside) => inside === false).length,
			looked: about?.some((line) => isKind(line, 'holes.looked_at')) ?? false,
			defects: defectsAt.get(place.key) ?? [],
			...(override && { override })
		});
	}

	for (const finding of holeFindings(holes, layout)) findings.push(finding);
	for (const [field, { differs, heads }] of fields)
		if (differs) findings.push({ is: 'plan_differs', field, lines: heads.map(({ line }) => line) });
	for (const defect of defects)
		for (const group of groupBy(
			defect.holes.filter(({ state }) => state === 'contested'),
			({ heads }) => heads.join()
		))
			findings.push({
				is: 'defect_contested',
				defect: defect.id,
				holes: group.map(({ key }) => key),
				lines: group[0].heads
			});
	if (idle.length) findings.push({ is: 'idle_strike', lines: idle.map((line) => line.id) });
	if (hollow.length) findings.push({ is: 'kept_is_struck', lines: hollow.map((line) => line.id) });
	const unreadable = lines.filter((line) => line.unreadable && line.unreadable !== 'withdrawn');
	if (unreadable.length)
		findings.push({ is: 'unreadable', lines: unreadable.map((line) => line.id) });

	return {
		id,
		planned: planLines.some((line) => line.id === id),
		plan,
		fields,
		overrides,
		retired: lines.some((line) => isKind(line, 'seam.retired') && !isStruck(line.id)),
		holes,
		defects,
		findings,
		lines,
		struck
	};
}

/**
 * What a new line about these holes stands on: their heads, ascending and each once, as `on` wants them.
 */
export function headsAt(holes: readonly Hole[]): string[] {
	return [...new Set(holes.flatMap((hole) => hole.heads))].sort();
}

/** Holes as the shortest list of ranges, the way bodies name them. */
export function rangesOf(holes: readonly Pick<Hole, 'by' | 'index'>[]): Holes {
	const sorted = [...holes].sort((a, b) =>
		(a.by ?? '') < (b.by ?? '') ? -1 : (a.by ?? '') > (b.by ?? '') ? 1 : a.index - b.index
	);
	const ranges: HoleRange[] = [];
	for (const { by, index } of sorted) {
		const last = ranges.at(-1);
		if (last && last.by === by && index <= last.to + 1) last.to = Math.max(last.to, index);
		else ranges.push({ ...(by !== undefined && { by }), from: index, to: index });
	}
	return ranges;
}

/** The keys of the holes a body names. A range that says it is of the planning line is of the plan. */
export function* keysOf(
	seam: string,
	ranges: readonly { by?: string | undefined; from: number; to: number }[]
): Generator<HoleKey> {
	for (const { by, from, to } of ranges)
		for (let index = from; index <= to; index++) yield holeKey(by === seam ? undefined : by, index);
}

function holds(line: Line): line is HoldingLine {
	return traits(line.envelope.kind, line.envelope.v)?.holds !== undefined;
}

function stateOf(heads: readonly HoldingLine[]): HoleState {
	const states = new Set(heads.map((line) => traits(line.entry.kind, line.entry.v)?.holds));
	if (states.size > 1) return 'contested';
	return [...states][0] ?? 'open';
}

/** Is there a rivet in a hole that no plan wants? A retired hole keeps the one that was driven before it was retired. */
function hasRivet(
	state: HoleState,
	stating: readonly Line[],
	isStruck: (id: string) => boolean,
	head?: string
): boolean {
	if (state === 'driven' || state === 'contested') return true;
	if (state !== 'retired') return false;
	const before = stating.filter((line) => line.id !== head && !isKind(line, 'holes.retired'));
	const heads = headsOf(before, isStruck) as HoldingLine[];
	return stateOf(heads) === 'driven';
}

// ---- the plan -------------------------------------------------------------------------------------------

const UNPLANNED: SeamPlan = {
	name: '',
	pattern: 'row',
	rows: 1,
	layout: 'parallel',
	numbering: 'row_by_row',
	order: 0,
	people: 1,
	sealing: 'dry',
	closes: false
};
const PLAN_KEYS = [
	...(Object.keys(UNPLANNED) as (keyof SeamPlan)[]),
	'assembly',
	'callout',
	'stack',
	'perRow',
	'endOne',
	'endLast',
	'method',
	'note'
] as const satisfies readonly (keyof SeamPlan)[];

function planOf(fields: ReadonlyMap<string, Field>): SeamPlan {
	const stated = PLAN_KEYS.map((key) => [key, fields.get(key)?.value] as const).filter(
		([, value]) => value !== undefined
	);
	const plan = { ...UNPLANNED, ...Object.fromEntries(stated) };
	return plan.perRow ? { ...plan, rows: plan.perRow.length } : plan;
}

type Place = Pick<Hole, 'key' | 'by' | 'index' | 'number' | 'row'>;

/** The holes of the plan as they lie. */
function layOut(
	id: string,
	lines: readonly Line[],
	isStruck: (id: string) => boolean,
	plan: SeamPlan
): Map<HoleKey, Place> {
	const planned = lines.find((line) => line.id === id);
	const { count, first } =
		planned && isKind(planned, 'seam.planned') ? planned.entry.body.holes : { count: 0, first: 1 };
	const row = rowAt(plan, count);
	let places: Place[] = Array.from({ length: count }, (_, i) => ({
		key: holeKey(undefined, i + 1),
		index: i + 1,
		number: first + i,
		row: row(i)
	}));
	for (const line of lines) {
		if (!isKind(line, 'holes.added') || isStruck(line.id)) continue;
		const { body } = line.entry;
		// Beyond what one seam may have they are of no plan; a rivet in one is counted as outside.
		if (places.length + body.count > MOST_HOLES) continue;
		const after =
			body.after && holeKey(body.after.by === id ? undefined : body.after.by, body.after.index);
		const found = after ? places.findIndex((place) => place.key === after) : -1;
		const at = found < 0 ? places.length : found + 1;
		const beside = places[at - 1];
		const added = Array.from({ length: body.count }, (_, i) => ({
			key: holeKey(line.id, i + 1),
			by: line.id,
			index: i + 1,
			number: body.first + i,
			row: body.row ?? beside?.row ?? 1
		}));
		places = [...places.slice(0, at), ...added, ...places.slice(at)];
	}
	return new Map(places.map((place) => [place.key, place]));
}

/** Which row the i-th planned hole (from 0) lies in, from 1. */
function rowAt({ rows, perRow, numbering }: SeamPlan, count: number): (i: number) => number {
	if (rows <= 1) return () => 1;
	if (numbering === 'across') return (i) => (i % rows) + 1;
	const sizes = perRow ?? Array.from({ length: rows }, (_, r) => Math.ceil((count - r) / rows));
	const ends: number[] = [];
	for (const size of sizes) ends.push((ends.at(-1) ?? 0) + size);
	return (i) => {
		const found = ends.findIndex((end) => i < end);
		return found < 0 ? ends.length : found + 1;
	};
}

function strayPlace(key: HoleKey): Place {
	const at = key.lastIndexOf(':');
	const by = key.slice(0, at);
	return { key, ...(by && { by }), index: Number(key.slice(at + 1)), row: 1 };
}

// ---- defects --------------------------------------------------------------------------------------------

const AFTER_DECISION = {
	leave: 'settled',
	no_defect: 'settled',
	drive_further: 'decided',
	replace: 'decided',
	replace_oversize: 'decided',
	refer: 'referred'
} as const;

function defectsOf(
	seam: string,
	lines: readonly Line[],
	isStruck: (id: string) => boolean
): Defect[] {
	const answers = new Map<string, Line[]>();
	for (const line of lines)
		if (isKind(line, 'defect.decided', 'defect.fixed'))
			gather(answers, line.entry.body.defect, line);
	return lines.flatMap((line): Defect[] => {
		if (!isKind(line, 'defect.noted') || isStruck(line.id)) return [];
		const { fault, note, holes } = line.entry.body;
		const about = (answers.get(line.id) ?? []).map((answer) => ({
			answer,
			keys: new Set(keysOf(seam, answer.entry ? holesOf(answer.entry) : []))
		}));
		return [
			{
				id: line.id,
				fault,
				...(note !== undefined && { note }),
				holes: [...keysOf(seam, holes)].map((key) => {
					const heads = headsOf(
						about.filter(({ keys }) => keys.has(key)).map(({ answer }) => answer),
						isStruck
					);
					return { key, state: defectState(heads), heads: heads.map((head) => head.id) };
				})
			}
		];
	});
}

function defectState(heads: readonly Line[]): DefectState {
	const states = new Set(
		heads.map((line) => {
			if (isKind(line, 'defect.decided')) return AFTER_DECISION[line.entry.body.decision];
			return isKind(line, 'defect.fixed') && line.entry.body.action === 'referred'
				? 'referred'
				: 'settled';
		})
	);
	if (states.size > 1) return 'contested';
	return [...states][0] ?? 'open';
}

/** Was the head inside the limits in force? Undefined where the reading alone does not say. */
function isInside({ body: { found, limits } }: Entry<'reading.taken'>): boolean | undefined {
	if (found.by === 'gauge') return found.size === 'inside';
	if (found.by === 'eye') return found.seated;
	if (!limits) return undefined;
	const margin = found.uncertainty?.nm ?? 0;
	const verdicts = [
		within(found.width?.nm, limits.widthLeast?.nm, limits.widthMost?.nm, margin),
		within(found.height?.nm, limits.heightLeast?.nm, limits.heightMost?.nm, margin)
	].filter((verdict) => verdict !== 'not judged');
	if (verdicts.includes('outside')) return false;
	// Within its uncertainty of a limit a reading settles nothing.
	return verdicts.length > 0 && !verdicts.includes('open') ? true : undefined;
}

function within(
	value: number | undefined,
	least = -Infinity,
	most = Infinity,
	margin: number
): 'inside' | 'outside' | 'open' | 'not judged' {
	if (value === undefined || (least === -Infinity && most === Infinity)) return 'not judged';
	if (value + margin < least || value - margin > most) return 'outside';
	return value - margin >= least && value + margin <= most ? 'inside' : 'open';
}

// ---- findings -------------------------------------------------------------------------------------------

function holeFindings(holes: readonly Hole[], layout: ReadonlyMap<HoleKey, Place>): Finding[] {
	const findings: Finding[] = [];
	const many = holes.filter((hole) => hole.heads.length > 1);
	for (const group of groupBy(many, (hole) => `${hole.state} ${hole.heads.join()}`)) {
		const { state, heads } = group[0];
		const is =
			state === 'contested' ? 'contested' : state === 'driven' ? 'driven_twice' : 'noted_twice';
		findings.push({ is, holes: group.map((hole) => hole.key), lines: heads });
	}
	const outside = holes.filter((hole) => hole.outside);
	if (outside.length)
		findings.push({
			is: 'outside',
			holes: outside.map((hole) => hole.key),
			lines: [...new Set(outside.flatMap((hole) => hole.heads))]
		});
	const standing = holes.filter((hole) => layout.has(hole.key) && hole.state !== 'retired');
	for (const group of groupBy(standing, (hole) => String(hole.number)))
		if (group.length > 1)
			findings.push({
				is: 'number_twice',
				number: group[0].number ?? 0,
				holes: group.map((hole) => hole.key)
			});
	return findings;
}

function groupBy<T>(items: readonly T[], name: (item: T) => string): [T, ...T[]][] {
	const groups = new Map<string, [T, ...T[]]>();
	for (const item of items) {
		const group = groups.get(name(item));
		if (group) group.push(item);
		else groups.set(name(item), [item]);
	}
	return [...groups.values()];
}
