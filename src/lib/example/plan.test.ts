import { readFileSync } from 'node:fs';
import { describe, expect, it } from 'vitest';
import { Length } from '$lib/logbook/scalars';
import { readCsv } from './csv';
import { readPlan } from './plan';
import text from './plan.csv?raw';

const plan = readPlan(text);
const seams = plan.flatMap((assembly) => assembly.seams);
const seam = (assembly: string, name: string) => {
	const found = plan
		.find((one) => one.name === assembly)
		?.seams.find((one) => one.name.startsWith(name));
	if (!found) throw new Error(`no seam ${assembly}, ${name}`);
	return found;
};

describe('the plan of the example', () => {
	it('is the one of the tests, without the marks of its five planted mistakes', () => {
		const marked = readCsv(readFileSync('tests/fixtures/example-plan.csv', 'utf8'));
		const unmarked = marked.map((row) =>
			row.map((cell) => (cell.startsWith('PLANTED MISTAKE') ? '' : cell))
		);
		expect(marked.flat().filter((cell) => cell.startsWith('PLANTED'))).toHaveLength(5);
		expect(readCsv(text)).toEqual(unmarked);
	});

	it('has 16 assemblies, 130 seams and 9,000 holes', () => {
		expect(plan).toHaveLength(16);
		expect(seams).toHaveLength(130);
		expect(seams.reduce((sum, { body }) => sum + body.holes.count, 0)).toBe(9000);
		expect(plan.map(({ name }) => name).slice(0, 3)).toEqual([
			'Stabilizer',
			'Left elevator',
			'Right elevator'
		]);
		expect([...new Set(plan.map(({ outline }) => outline))]).toEqual([
			'stabilizer',
			'elevator',
			'fin',
			'rudder',
			'spar',
			'wing',
			'tank',
			'flap',
			'fuselage',
			'floor',
			'tail_cone'
		]);
	});

	it('reads the columns', () => {
		expect(seam('Stabilizer', 'Skin to front spar, upper').body).toEqual({
			holes: { count: 50, first: 1 },
			callout: 'MS20426AD3-3.5',
			stack: [
				{ thickness: { nm: 508_000, unit: 'in' }, material: '2024-T3', prep: 'dimple' },
				{
					thickness: { nm: 1_600_200, unit: 'in' },
					material: '6061-T6',
					prep: 'countersunk_under_dimple'
				}
			],
			pattern: 'row',
			rows: 1,
			pitch: { nm: 23_812_500, unit: 'in' },
			edge: { nm: 6_350_000, unit: 'in' },
			endOne: 'left tip',
			endLast: 'right tip',
			drawing: 'YT-01',
			step: '7',
			people: 1,
			sealing: 'dry',
			closes: false,
			method: 'driven'
		});
		for (const { body } of seams) expect(Length.safeParse(body.pitch).success).toBe(true);
	});

	it('reads what stands in the notes', () => {
		const count = (holds: (body: (typeof seams)[number]['body']) => boolean | undefined) =>
			seams.filter(({ body }) => holds(body)).length;
		expect(count(({ people }) => people === 2)).toBe(8);
		expect(count(({ sealing }) => sealing === 'wet')).toBe(14);
		expect(count(({ closes }) => closes)).toBe(11);
		expect(count(({ pattern }) => pattern === 'nutplates')).toBe(8);
		expect(count(({ method }) => method === 'squeezed')).toBe(10);
		expect(count(({ method }) => method === 'back_riveted')).toBe(8);
		expect(count(({ layout }) => layout === 'staggered')).toBe(1);
	});

	it('reads the ranges that differ', () => {
		expect(seam('Left wing box', 'Upper skin to main spar').overrides).toMatchObject([
			{
				holes: [{ from: 97, to: 132 }],
				callout: 'MS20426AD4-4.5',
				stack: [{ prep: 'dimple' }, { thickness: { nm: 1_600_200, unit: 'in' } }]
			}
		]);
		expect(seam('Left fuel bay', 'Brackets to baffle').overrides).toEqual([
			{ holes: [{ from: 33, to: 36 }], method: 'pulled', note: 'drawing allows' }
		]);
		expect(seam('Stabilizer', 'Rear spar: hinge brackets').overrides).toEqual([
			{ holes: [{ from: 9, to: 12 }], leaveOpen: 'the center bracket is aligned' }
		]);
		expect(seam('Center section and floor', 'Spar carry-through').overrides).toEqual([
			{ holes: [{ from: 1, to: 8 }], leaveOpen: 'bolts go through with the wings' }
		]);
		expect(seam('Right wing box', 'Upper skin to ribs').overrides).toEqual([
			{ holes: [{ from: 1, to: 8 }], leaveOpen: 'the root fairing nutplates' }
		]);
		expect(seams.filter(({ overrides }) => overrides.length > 0)).toHaveLength(8);
	});

	it('says which row cannot be read', () => {
		const head = text.slice(0, text.indexOf('\n') + 1);
		expect(() => readPlan('a,b\n')).toThrow('the columns must be');
		for (const [row, why] of [
			['Fin,Ribs,X,0.025 plain,32,1,0.6,0.2,', 'row 2: “0.025 plain” is not a sheet'],
			['Fin,Ribs,X,0.025 A plain,0,1,0.6,0.2,', 'row 2: “0” is not a number'],
			['Fin,Ribs,X,0.025 A plain,9,1,six,0.2,', 'row 2: “six” is not a length'],
			['Canoe,Ribs,X,0.025 A plain,9,1,0.6,0.2,', 'row 2: no outline for “Canoe”']
		] as const)
			expect(() => readPlan(head + row)).toThrow(why);
	});
});
