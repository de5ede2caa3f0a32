/**
 * What the sheets of the bench write: pure, from the fold and what was chosen. One line each, or as many as so many holes
 * take: they are written in one act, and undone in one.
 */
import type { Draft } from '$lib/device/append';
import { holesOf } from '$lib/logbook/entry';
import {
	headsAt,
	keysOf,
	rangesOf,
	type Defect,
	type Finding,
	type Hole,
	type HoleKey,
	type Seam
} from '$lib/logbook/fold/seam';
import { isKind, type Line } from '$lib/logbook/fold/line';
import type { Body, Fault } from '$lib/logbook/kinds';
import { fitting } from '../logbook/fitting';
import { drivenDrafts, type HowDriven } from './run';

/** Text as a line takes it, or undefined when nothing was typed. */
export function typed(text: string): string | undefined {
	const trimmed = text.trim();
	return trimmed === '' ? undefined : trimmed;
}

export function defectDrafts(
	seam: Seam,
	holes: readonly Hole[],
	fault: Fault,
	note?: string
): Draft<'defect.noted'>[] {
	return fitting(holes, headsOf).map((some) => ({
		kind: 'defect.noted',
		seam: seam.id,
		on: headsAt(some),
		body: { holes: rangesOf(some), fault, ...(note !== undefined && { note }) }
	}));
}

export function leftOpenDrafts(
	seam: Seam,
	holes: readonly Hole[],
	reason: string,
	closedBy?: string
): Draft<'holes.left_open'>[] {
	return fitting(holes, headsOf).map((some) => ({
		kind: 'holes.left_open',
		seam: seam.id,
		on: headsAt(some),
		body: { holes: rangesOf(some), reason, ...(closedBy !== undefined && { closedBy }) }
	}));
}

export function drilledOutDrafts(
	seam: Seam,
	holes: readonly Hole[],
	reason?: string
): Draft<'holes.drilled_out'>[] {
	return fitting(holes, headsOf).map((some) => ({
		kind: 'holes.drilled_out',
		seam: seam.id,
		on: headsAt(some),
		body: { holes: rangesOf(some), ...(reason !== undefined && { reason }) }
	}));
}

const headsOf = ({ heads }: Hole) => heads;

type Action = Body<'defect.fixed'>['action'];

export interface Fix {
	readonly action: Action;
	/** On what it was decided. */
	readonly basis?: NonNullable<Body<'defect.fixed'>['basis']>;
	readonly note?: string;
	/** The part number of the new rivet, where it is another. */
	readonly callout?: string;
}

/**
 * The lines that put a defect right. A replaced rivet is three lines in one act: drilled out, driven again, and the fix
 * that names the new rivet; their ids are made up front because each stands on the one before.
 */
export function fixDrafts(
	seam: Seam,
	defect: Defect,
	holes: readonly Hole[],
	fix: Fix,
	how: HowDriven,
	newId: () => string
): Draft[] {
	const answers = new Map(defect.holes.map(({ key, heads }) => [key, heads]));
	// Besides what the holes stand on: the defect, the drilling out and the new rivet.
	return fitting(holes, ({ key, heads }) => [...heads, ...(answers.get(key) ?? [])], 3).flatMap(
		(some) => fixInOneLine(seam, defect, some, fix, how, newId)
	);
}

function fixInOneLine(
	seam: Seam,
	defect: Defect,
	holes: readonly Hole[],
	{ action, basis, note, callout }: Fix,
	how: HowDriven,
	newId: () => string
): Draft[] {
	const keys = new Set(holes.map(({ key }) => key));
	const answers = defect.holes.filter(({ key }) => keys.has(key)).flatMap(({ heads }) => heads);
	const ranges = rangesOf(holes);
	const body = {
		defect: defect.id,
		holes: ranges,
		action,
		...(basis !== undefined && { basis }),
		...(note !== undefined && { note })
	};
	if (action !== 'replaced' && action !== 'replaced_oversize')
		return [
			{ kind: 'defect.fixed', seam: seam.id, on: [...answers, ...headsAt(holes), defect.id], body }
		];
	const out = newId();
	// A hole drilled out before only gets its new rivet.
	const filled = holes.filter(({ state }) => state !== 'drilled_out');
	const drilled = holes.filter(({ state }) => state === 'drilled_out');
	const [planned] = drivenDrafts(seam, holes.slice(0, 1), how);
	const rivet = newId();
	return [
		...(filled.length > 0
			? [
					{
						id: out,
						kind: 'holes.drilled_out' as const,
						seam: seam.id,
						on: headsAt(filled),
						body: { holes: rangesOf(filled), defect: defect.id }
					}
				]
			: []),
		{
			id: rivet,
			kind: 'holes.driven',
			seam: seam.id,
			on: [...headsAt(drilled), ...(filled.length > 0 ? [out] : [])],
			body: {
				...(planned as Draft<'holes.driven'>).body,
				holes: ranges,
				...(callout !== undefined && { callout })
			}
		},
		{
			kind: 'defect.fixed',
			seam: seam.id,
			on: [...answers, rivet, defect.id],
			body: { ...body, rivet }
		}
	];
}

/** Keys of the holes a line names. */
function keysNamed(seam: string, line: Line): Set<HoleKey> {
	return new Set(line.entry ? keysOf(seam, holesOf(line.entry)) : []);
}

/** A finding about holes that one of its lines can settle. */
export interface HoleFinding {
	readonly is: 'driven_twice' | 'noted_twice' | 'contested';
	readonly holes: readonly HoleKey[];
	readonly lines: readonly string[];
}

export function isHoleFinding(finding: Finding): finding is Finding & HoleFinding {
	return (
		finding.is === 'driven_twice' || finding.is === 'noted_twice' || finding.is === 'contested'
	);
}

/**
 * The lines that settle a finding in favour of one of its lines.
 *
 * The others are struck, naming the one kept, where this person may strike them and where all they say is about these
 * holes: a strike takes a whole line, so one that also speaks of other holes would undo those. Everywhere else the kept
 * line is written again for these holes, standing on all of them.
 */
export function settleDrafts(
	seam: Seam,
	finding: HoleFinding,
	keep: Line,
	mayStrike: (line: Line) => boolean
): Draft[] {
	const kept = keysNamed(seam.id, keep);
	const others = seam.lines.filter(({ id }) => finding.lines.includes(id) && id !== keep.id);
	const strikable =
		finding.is === 'driven_twice' &&
		others.every(
			(line) => mayStrike(line) && [...keysNamed(seam.id, line)].every((key) => kept.has(key))
		);
	if (strikable)
		return others.map((line) => ({
			kind: 'entry.struck',
			seam: seam.id,
			on: [line.id, keep.id],
			body: { entry: line.id, reason: 'logged_twice', keeps: keep.id }
		}));
	const named = new Set(finding.holes);
	const holes = seam.holes.filter(({ key }) => named.has(key));
	if (
		!isKind(keep, 'holes.driven', 'holes.left_open', 'holes.drilled_out', 'holes.retired') ||
		holes.length === 0
	)
		return [];
	const { kind, body, author } = keep.entry;
	return fitting(holes, () => finding.lines).map(
		(some) =>
			({
				kind,
				seam: seam.id,
				on: finding.lines,
				body: {
					...body,
					holes: rangesOf(some),
					// Credit stays with who drove it, not with who settled it.
					...(kind === 'holes.driven' && { shooter: keep.entry.body.shooter ?? author })
				}
			}) as Draft
	);
}
