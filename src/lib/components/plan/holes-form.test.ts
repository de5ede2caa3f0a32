import { describe, expect, it } from 'vitest';
import { foldSeam } from '$lib/logbook/fold/seam';
import { Scribe } from '../../../../tests/support/scribe';
import { emptyAddition, readAddition, readRetirement } from './holes-form';

function setUp() {
	const scribe = new Scribe();
	const seam = scribe.seam(10);
	return { scribe, seam, fold: () => foldSeam(seam, scribe.lines) };
}

describe('adding holes', () => {
	it('offers the next free number and puts them at the end', () => {
		const typed = emptyAddition(setUp().fold());
		expect(typed.first).toBe('11');
		const read = readAddition({ ...typed, count: '3' }, setUp().fold());
		expect(read).toEqual({ ok: true, body: { count: 3, first: 11 } });
	});

	it('puts them after a hole, by its identity', () => {
		const { fold } = setUp();
		const read = readAddition({ ...emptyAddition(fold()), after: '4' }, fold());
		expect(read.ok && read.body.after).toEqual({ index: 4 });
	});

	it('never uses a number again', () => {
		const { fold } = setUp();
		const read = readAddition({ ...emptyAddition(fold()), first: '10' }, fold());
		expect(!read.ok && read.errors.first).toMatch(/Number 10 is taken/);
	});
});

describe('retiring holes', () => {
	it('stands on what holds them', () => {
		const { scribe, seam, fold } = setUp();
		const driven = scribe.drive(seam, 1, 5);
		const read = readRetirement({ holes: '5-6', reason: ' doubler moved ' }, fold());
		expect(read).toEqual({
			ok: true,
			lines: [{ body: { holes: [{ from: 5, to: 6 }], reason: 'doubler moved' }, on: [driven.id] }]
		});
	});

	it('retires none twice', () => {
		const { scribe, seam, fold } = setUp();
		scribe.write('holes.retired', { holes: [{ from: 6, to: 6 }] }, { seam });
		const read = readRetirement({ holes: '6', reason: '' }, fold());
		expect(!read.ok && read.errors.holes).toBe('There is no hole 6 on this seam.');
	});

	it('takes several lines where one cannot stand on all that holds them', () => {
		const scribe = new Scribe();
		const seam = scribe.seam(1200);
		for (let hole = 1; hole <= 1200; hole++) scribe.drive(seam, hole, hole);
		const read = readRetirement({ holes: '1-1200', reason: '' }, foldSeam(seam, scribe.lines));
		const lines = read.ok ? read.lines : [];
		expect(lines.length).toBeGreaterThan(1);
		expect(lines.every(({ on }) => on.length <= 800)).toBe(true);
		expect(lines.flatMap(({ on }) => on)).toHaveLength(1200);
		expect(lines[0]?.body.holes[0]?.from).toBe(1);
		expect(lines.at(-1)?.body.holes[0]?.to).toBe(1200);
	});
});
