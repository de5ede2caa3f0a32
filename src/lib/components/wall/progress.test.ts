import { describe, expect, it } from 'vitest';
import type { Assembly } from '$lib/logbook/fold/build';
import { totalsOf, type SeamSummary } from '$lib/logbook/fold/summary';
import { lastEvening, needsOf, progressOf, stateTag } from './progress';

const ANA = 'ana';
const JO = 'jo';

function seam(name: string, part: Partial<SeamSummary> = {}): SeamSummary {
	return {
		fold: 1,
		seam: name,
		assembly: 'wing',
		name,
		order: 0,
		people: 1,
		closes: false,
		retired: false,
		holes: 10,
		driven: 0,
		open: 10,
		leftOpen: 0,
		drilledOut: 0,
		contested: 0,
		twice: 0,
		outside: 0,
		defects: 0,
		findings: 0,
		lines: 1,
		struck: 0,
		evenings: {},
		...part
	};
}

const assembly = (id: string, order: number): Assembly => ({
	id,
	name: id,
	order,
	fields: new Map(),
	steps: [],
	retired: false,
	closed: false,
	closing: []
});

describe('progress', () => {
	it('puts seams under their assembly in order, retired ones last', () => {
		const [wing, fin] = progressOf(
			[assembly('wing', 1), assembly('fin', 2)],
			[
				seam('c', { order: 3 }),
				seam('b', { order: 1, retired: true }),
				seam('a', { order: 2 }),
				seam('f', { assembly: 'fin' })
			]
		);
		expect(wing?.seams.map(({ name }) => name)).toEqual(['a', 'c', 'b']);
		expect(wing?.totals).toMatchObject({ seams: 2, holes: 20 });
		expect(fin?.seams).toHaveLength(1);
	});

	it('loses no seam whose assembly has not arrived', () => {
		const progress = progressOf([assembly('wing', 1)], [seam('x', { assembly: 'gone' })]);
		expect(progress.at(-1)).toMatchObject({ known: false, totals: { holes: 10 } });
	});
});

describe('the tag of a seam or assembly', () => {
	it('says the worst first', () => {
		const worst = { driven: 9, open: 0, contested: 1, defects: 2 };
		expect(stateTag(seam('a', worst))?.words).toBe('2 with defect');
		expect(stateTag(seam('a', { ...worst, defects: 0 }))?.words).toBe('1 contested');
		expect(stateTag(seam('a', { driven: 10, open: 0 }))?.words).toBe('all driven');
		expect(stateTag(seam('a', { driven: 8, open: 0, leftOpen: 2 }))?.words).toBe('2 left open');
	});

	it('says nothing where the count does', () => {
		expect(stateTag(seam('a', { driven: 4, open: 6 }))).toBeUndefined();
		expect(stateTag(totalsOf([]))).toBeUndefined();
	});
});

describe('the last evening', () => {
	it('adds up rivets, and names people without numbers', () => {
		const evening = lastEvening(
			[
				seam('a', { evenings: { '2026-03-13': { [JO]: 9 }, '2026-03-14': { [ANA]: 5 } } }),
				seam('b', { evenings: { '2026-03-14': { [ANA]: 2, [JO]: 3 } } })
			],
			'2026-03-14'
		);
		expect(evening).toMatchObject({ day: '2026-03-14', rivets: 10, people: [ANA, JO] });
	});

	it('is not one that a wrong clock put into the future', () => {
		const summaries = [seam('a', { evenings: { '2031-01-01': { [ANA]: 5 } } })];
		expect(lastEvening(summaries, '2026-03-14')).toBeUndefined();
	});
});

describe('what needs somebody', () => {
	it('lists each seam once, the urgent first', () => {
		const progress = progressOf(
			[assembly('wing', 1)],
			[
				seam('pair', { people: 2 }),
				seam('pair done', { people: 2, driven: 10, open: 0 }),
				seam('twice', { findings: 1 }),
				seam('split', { contested: 1, findings: 1 }),
				seam('tipped', { defects: 1, people: 2 }),
				seam('gone', { defects: 1, retired: true })
			]
		);
		expect(needsOf(progress).map(({ need, seam: { name } }) => [need, name])).toEqual([
			['defect', 'tipped'],
			['contested', 'split'],
			['finding', 'twice'],
			['two_people', 'pair']
		]);
	});
});
