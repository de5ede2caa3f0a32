import { describe, expect, it } from 'vitest';
import { foldSeam } from '$lib/logbook/fold/seam';
import { ASSEMBLY, idOf, Scribe } from '../../../../tests/support/scribe';
import { changedFields as changedIn, follow, headsOfFields, settlement } from './opened';
import {
	changedBody,
	emptyRange,
	emptySeam,
	openedSeam,
	nextSeam,
	plannedBody,
	readSeam,
	SEAM_FORM,
	typedOf,
	type SeamTyped
} from './seam-form';

const changedFields = (before: SeamTyped, after: SeamTyped) => changedIn(SEAM_FORM, before, after);

const RANGE = idOf(77);

function typed(part: Partial<SeamTyped> = {}): SeamTyped {
	return { ...emptySeam(ASSEMBLY, 3), name: 'Skin to spar', count: '64', ...part };
}

/** The form of a seam as it stands in the log, after lines were written. */
function planned(part: Partial<SeamTyped> = {}) {
	const scribe = new Scribe();
	const read = readSeam(typed(part), 'in');
	if (!read.ok) throw new Error(JSON.stringify(read.errors));
	const seam = idOf(500);
	const line = scribe.write('seam.planned', plannedBody(read.values, read.holes), {
		id: seam,
		seam
	});
	return { scribe, seam, line, fold: () => foldSeam(seam, scribe.lines) };
}

function errors(part: Partial<SeamTyped>) {
	const read = readSeam(typed(part), 'in');
	return read.ok ? {} : read.errors;
}

describe('the form of a new seam', () => {
	it('asks for nothing but a name, an assembly and the holes', () => {
		const read = readSeam(typed(), 'in');
		expect(read.ok && plannedBody(read.values, read.holes)).toEqual({
			name: 'Skin to spar',
			assembly: ASSEMBLY,
			order: 3,
			holes: { count: 64, first: 1 },
			method: 'driven',
			pattern: 'row',
			people: 1,
			sealing: 'dry',
			closes: false
		});
	});

	it('says at each field what is missing, in words', () => {
		const found = errors({ name: ' ', assembly: '', count: '', first: 'one' });
		expect(Object.keys(found).sort()).toEqual(['assembly', 'count', 'first', 'name']);
		expect(found.first).toBe('Write a whole number from 0 to 1,000,000.');
	});

	it('reads lengths the way they are typed, with the unit typed', () => {
		const read = readSeam(typed({ pitch: '3/4', edge: '1.2 mm' }), 'in');
		expect(read.ok && [read.values.pitch, read.values.edge]).toEqual([
			{ nm: 19_050_000, unit: 'frac' },
			{ nm: 1_200_000, unit: 'mm' }
		]);
		expect(errors({ pitch: '3/7' }).pitch).toMatch(/64ths/);
	});

	it('leaves out sheets that were left empty, and wants a thickness for the others', () => {
		const sheet = { thickness: '.032', material: '2024-T3', prep: 'dimple' as const, part: '' };
		const blank = { thickness: '', material: '', prep: 'plain' as const, part: '' };
		const read = readSeam(typed({ sheets: [sheet, blank] }), 'in');
		expect(read.ok && read.values.stack).toEqual([
			{ thickness: { nm: 812_800, unit: 'in' }, material: '2024-T3', prep: 'dimple' }
		]);
		expect(errors({ sheets: [{ ...sheet, thickness: '' }] })).toHaveProperty([
			'sheets.0.thickness'
		]);
	});

	it('names the holes of a range by identity, from the numbers on the skin', () => {
		const range = { ...emptyRange(RANGE), holes: '110-112, 120', leaveOpen: 'until rib 4 is in' };
		const read = readSeam(typed({ first: '101', ranges: [range] }), 'in');
		expect(read.ok && read.values.overrides.get(RANGE)).toEqual({
			holes: [
				{ from: 10, to: 12 },
				{ from: 20, to: 20 }
			],
			leaveOpen: 'until rib 4 is in'
		});
		expect(errors({ ranges: [{ ...range, holes: '64-65' }] })['ranges.0.holes']).toBe(
			'There is no hole 65 on this seam.'
		);
	});

	it('wants the holes of uneven rows to add up', () => {
		const rows = { pattern: 'rows', rows: '2' };
		expect(errors({ ...rows, perRow: '32, 31' }).perRow).toBe(
			'These add up to 63; the seam has 64 holes.'
		);
		expect(errors({ ...rows, perRow: '32 32' })).toEqual({});
	});

	it('keeps for the next seam what neighbours share', () => {
		const next = nextSeam(typed({ callout: 'MS20470AD4-4', note: 'wet', closes: true }));
		expect(next).toMatchObject({ callout: 'MS20470AD4-4', order: '4', name: '', count: '' });
		expect(next).toMatchObject({ note: '', closes: false });
	});
});

describe('changing a seam', () => {
	it('shows what was planned, and unchanged it changes nothing', () => {
		const { fold } = planned({
			callout: 'MS20470AD4-4',
			pitch: '3/4',
			pattern: 'rows',
			rows: '2',
			layout: 'staggered',
			sheets: [{ thickness: '.040', material: '', prep: 'countersunk', part: 'skin' }],
			ranges: [{ ...emptyRange(RANGE), holes: '5-8', callout: 'MS20470AD4-5' }]
		});
		const shown = typedOf(fold());
		expect(shown).toMatchObject({ pitch: '3/4 in', rows: '2', count: '64' });
		expect(shown.ranges[0]).toMatchObject({ holes: '5–8', callout: 'MS20470AD4-5' });
		expect(changedFields(shown, { ...shown, name: ` ${shown.name} ` })).toEqual([]);
	});

	it('carries only what was changed, standing on what stated it', () => {
		const { fold, line } = planned({ callout: 'MS20470AD4-4', note: 'deburr' });
		const before = typedOf(fold());
		const after = { ...before, callout: 'MS20470AD4-5', note: '' };
		const fields = changedFields(before, after);
		expect(changedBody(read(after, fold()), fields)).toEqual({
			callout: 'MS20470AD4-5',
			note: null
		});
		expect(headsOfFields(openedSeam(fold()), fields)).toEqual([line.id]);
	});

	it('empties what only several rows have, when one row remains', () => {
		const { fold } = planned({ pattern: 'rows', rows: '2', rowSpacing: '1/2' });
		const before = typedOf(fold());
		const after = { ...before, pattern: 'row' };
		const fields = changedFields(before, after);
		expect(changedBody(read(after, fold()), fields)).toEqual({
			pattern: 'row',
			rows: null,
			rowSpacing: null
		});
	});

	it('treats each range as a field of its own', () => {
		const { fold } = planned({ ranges: [{ ...emptyRange(RANGE), holes: '5-8', note: 'doubler' }] });
		const before = typedOf(fold());
		const added = { ...emptyRange(idOf(78)), holes: '9', leaveOpen: 'until the bracket is in' };
		const fields = changedFields(before, { ...before, ranges: [added] });
		expect(changedBody(read({ ...before, ranges: [added] }, fold()), fields)).toEqual({
			overrides: {
				[RANGE]: null,
				[idOf(78)]: { holes: [{ from: 9, to: 9 }], leaveOpen: 'until the bracket is in' }
			}
		});
	});

	it('takes over what others change while the form is open, but not what is being typed', () => {
		const { scribe, seam, line, fold } = planned({ callout: 'MS20470AD4-4', note: 'deburr' });
		const opened = openedSeam(fold());
		const mine = { ...opened.typed, callout: 'MS20470AD4-6' };
		expect(follow(SEAM_FORM, opened, mine, openedSeam(fold()))).toEqual({
			opened,
			typed: mine,
			both: []
		});

		const theirs = scribe.write(
			'seam.changed',
			{
				callout: 'MS20470AD4-5',
				note: 'wet',
				overrides: { [RANGE]: { holes: [{ from: 3, to: 4 }] } }
			},
			{ seam, on: [line] }
		);
		const followed = follow(SEAM_FORM, opened, mine, openedSeam(fold()));
		expect(followed.both).toEqual(['callout']);
		expect(followed.typed).toMatchObject({
			callout: 'MS20470AD4-6',
			note: 'wet',
			ranges: [{ id: RANGE, holes: '3–4' }]
		});
		expect(changedFields(followed.opened.typed, followed.typed)).toEqual(['callout']);
		// It stands on what was seen, not on what came meanwhile: both values will be shown.
		expect(headsOfFields(followed.opened, ['callout'])).toEqual([line.id]);
		expect(headsOfFields(followed.opened, ['note'])).toEqual([theirs.id]);
	});

	it('settles a field stated twice with one line that stands on both', () => {
		const { scribe, seam, line, fold } = planned();
		scribe.write('seam.changed', { callout: 'MS20470AD4-5' }, { seam, on: [line] });
		scribe.write('seam.changed', { callout: 'MS20470AD4-6' }, { seam, on: [line] });
		const { fields } = fold();
		expect(fields.get('callout')?.differs).toBe(true);
		const kept = fields.get('callout')?.heads[0]?.line ?? '';
		const { body, on } = settlement<'seam.changed'>(fields, 'callout', kept);
		scribe.write('seam.changed', body, {
			seam,
			on: scribe.lines.filter(({ id }) => on.includes(id))
		});
		expect(fold().fields.get('callout')).toMatchObject({ differs: false, value: 'MS20470AD4-5' });
	});
});

function read(form: SeamTyped, { holes }: ReturnType<typeof foldSeam>) {
	const found = readSeam(form, 'in', holes);
	if (!found.ok) throw new Error(JSON.stringify(found.errors));
	return found.values;
}
