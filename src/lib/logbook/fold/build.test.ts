import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { ANA, ASSEMBLY, BUILD, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import { foldBuild } from './build';
import type { Line } from './line';

function scene() {
	const scribe = new Scribe();
	const opened = scribe.write(
		'build.opened',
		{ name: 'Yarrow Two', rules: { 'length.round': 'nearest 1/32' } },
		{ id: BUILD }
	);
	const assembly = scribe.write(
		'assembly.planned',
		{ name: 'Left elevator', order: 2 },
		{ id: ASSEMBLY, assembly: ASSEMBLY }
	);
	return { scribe, opened, assembly, fold: () => foldBuild(scribe.lines) };
}

describe('the fold of a build', () => {
	it('knows its name, its rules and its assemblies in order', () => {
		const { scribe, fold } = scene();
		scribe.write(
			'assembly.planned',
			{ name: 'Stabilizer', order: 1 },
			{ id: idOf(3), assembly: idOf(3) }
		);
		expect(fold()).toMatchObject({
			name: 'Yarrow Two',
			units: 'in',
			rules: new Map([['length.round', 'nearest 1/32']])
		});
		expect(fold().assemblies.map(({ name }) => name)).toEqual(['Stabilizer', 'Left elevator']);
	});

	it('says which fields two people gave different values', () => {
		const { scribe, opened, fold } = scene();
		const a = scribe.write(
			'build.described',
			{ name: 'Yarrow II', rules: { 'length.round': 'up' } },
			{ on: [opened] }
		);
		const b = scribe.write('build.described', { name: 'Yarrow 2' }, { on: [opened], author: JO });
		expect(fold().differing).toEqual([{ of: 'build', field: 'name', lines: [a.id, b.id] }]);
		expect(fold().rules.get('length.round')).toBe('up');
	});

	it('knows the crew as the log has it', () => {
		const { scribe, fold } = scene();
		const ana = scribe.write('crew.joined', { person: ANA, role: 'owner' });
		const jo = scribe.write('crew.joined', { person: JO, role: 'builder' });
		const role = scribe.write('crew.role', { person: JO, role: 'inspector' }, { on: [jo] });
		expect(fold().crew).toEqual(
			new Map([
				[ANA, 'owner'],
				[JO, 'inspector']
			])
		);
		const left = scribe.write('crew.left', { person: JO }, { on: [role] });
		expect(fold().crew.get(JO)).toBe('left');
		scribe.write('owner.changed', { from: ANA, to: JO }, { on: [ana, left] });
		expect([...fold().crew.values()]).toEqual(['builder', 'owner']);
	});

	it('takes who opened it for the owner until a crew line speaks of them', () => {
		const { scribe, fold } = scene();
		expect(fold().crew).toEqual(new Map([[ANA, 'owner']]));
		scribe.write('crew.joined', { person: ANA, role: 'builder' });
		scribe.write('crew.joined', { person: JO, role: 'owner' });
		expect(fold().crew.get(ANA)).toBe('builder');
	});

	it('keeps somebody out when one of two crew lines that do not know of each other says so, else in the lesser role', () => {
		const { scribe, fold } = scene();
		const jo = scribe.write('crew.joined', { person: JO, role: 'builder' });
		const a = scribe.write('crew.role', { person: JO, role: 'inspector' }, { on: [jo] });
		const b = scribe.write('crew.role', { person: JO, role: 'follower' }, { on: [jo] });
		expect(fold().crew.get(JO)).toBe('follower');
		const left = scribe.write('crew.left', { person: JO }, { on: [jo] });
		expect(fold().crew.get(JO)).toBe('left');
		scribe.write('crew.joined', { person: JO, role: 'inspector' }, { on: [a, b, left] });
		expect(fold().crew.get(JO)).toBe('inspector');
	});

	it('is still the last owner’s when it was handed to somebody who is out', () => {
		const { scribe, fold } = scene();
		const ana = scribe.write('crew.joined', { person: ANA, role: 'owner' });
		const jo = scribe.write('crew.joined', { person: JO, role: 'builder' });
		scribe.write('owner.changed', { from: ANA, to: JO }, { on: [ana, jo] });
		scribe.write('crew.left', { person: JO }, { on: [jo] });
		expect(fold().crew).toEqual(
			new Map([
				[ANA, 'owner'],
				[JO, 'left']
			])
		);
	});

	it('holds a device for whom it was enrolled first', () => {
		const { scribe, fold } = scene();
		const key = 'B'.repeat(87);
		const first = scribe.write('device.enrolled', { key });
		scribe.write(
			'device.enrolled',
			{ key: 'C'.repeat(87) },
			{ author: JO, device: first.envelope.device }
		);
		expect(fold().devices.get(first.envelope.device)).toEqual({ person: ANA, key, line: first.id });
	});

	it('is closed while one of two who did not know of each other says so', () => {
		const { scribe, fold } = scene();
		const closed = scribe.write('assembly.closed', {}, { assembly: ASSEMBLY });
		expect(fold().assemblies[0]?.closed).toBe(true);
		const reopened = scribe.write(
			'assembly.reopened',
			{ reason: 'swarf' },
			{ assembly: ASSEMBLY, on: [closed] }
		);
		expect(fold().assemblies[0]).toMatchObject({ closed: false, closing: [reopened.id] });
		scribe.write('assembly.closed', {}, { assembly: ASSEMBLY, on: [closed], author: JO });
		expect(fold().assemblies[0]?.closed).toBe(true);
	});

	it('offers what is in use, the newest first, without what was struck', () => {
		const { scribe, fold } = scene();
		const old = scribe.write('setup.made', { gun: '2X' });
		const wrong = scribe.write('setup.made', { gun: '9X' });
		const now = scribe.write('setup.made', { gun: '3X' });
		scribe.strike(wrong);
		expect(fold().setups.map(({ id }) => id)).toEqual([now.id, old.id]);
	});

	it('is the same for every order of arrival', () => {
		const { scribe, opened } = scene();
		const a = scribe.write('build.described', { name: 'A' }, { on: [opened] });
		scribe.write('build.described', { name: 'B' }, { on: [opened, a] });
		scribe.write('crew.joined', { person: JO, role: 'builder' });
		scribe.write('crew.left', { person: JO });
		scribe.strike(a);
		const expected = foldBuild(scribe.lines);
		fc.assert(
			fc.property(
				fc.shuffledSubarray<Line>(scribe.lines, { minLength: scribe.lines.length }),
				(lines) => {
					expect(foldBuild(lines)).toEqual(expected);
				}
			)
		);
	});
});
