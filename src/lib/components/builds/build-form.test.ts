import { describe, expect, it } from 'vitest';
import { foldBuild } from '$lib/logbook/fold/build';
import { BUILD, Scribe } from '../../../../tests/support/scribe';
import { EMPTY_BUILD, readBuild, typedBuild } from './build-form';

describe('opening a build', () => {
	it('needs a name and no more', () => {
		expect(readBuild({ ...EMPTY_BUILD, name: ' Yarrow Two ' })).toEqual({
			ok: true,
			body: { name: 'Yarrow Two', units: 'in' }
		});
	});

	it('keeps what it is, where, and the units', () => {
		const typed = { name: 'Yarrow Two', about: 'two-seater', place: 'Hangar 4', units: 'mm' };
		expect(readBuild(typed)).toEqual({ ok: true, body: typed });
	});

	it('says at the field what is wrong', () => {
		const read = readBuild({ ...EMPTY_BUILD, about: 'x'.repeat(401) });
		expect(!read.ok && Object.keys(read.errors)).toEqual(['name', 'about']);
	});
});

it('a build shows as text what was typed about it', () => {
	const scribe = new Scribe();
	scribe.write('build.opened', { name: 'Yarrow Two', about: 'two-seater' }, { id: BUILD });
	expect(typedBuild(foldBuild(scribe.lines))).toEqual({
		name: 'Yarrow Two',
		about: 'two-seater',
		place: '',
		units: 'in'
	});
});
