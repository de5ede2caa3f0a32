import { describe, expect, it } from 'vitest';
import { ANA, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import type { Body } from '$lib/logbook/kinds';
import { foldSeam, holeKey } from '$lib/logbook/fold/seam';
import { layoutOf } from './layout';
import { drivenDrafts, lastWritten, nextRun, numbersOf, undoDrafts, type RunLength } from './run';

const DEVICE = idOf(0xd0);

function scene(count = 20, plan: Partial<Body<'seam.planned'>> = {}) {
	const scribe = new Scribe();
	const seam = scribe.seam(count, plan);
	const fold = () => foldSeam(seam, scribe.lines);
	const next = (length: RunLength = 5, pick?: Parameters<typeof nextRun>[3]) =>
		numbersOf(nextRun(fold(), length, DEVICE, pick).drive);
	return { scribe, seam, fold, next };
}
const at = (index: number) => holeKey(undefined, index);

describe('the next run', () => {
	it('is the first open holes, then those after what this device drove', () => {
		const { scribe, seam, next } = scene();
		expect(next()).toEqual([1, 2, 3, 4, 5]);
		scribe.drive(seam, 1, 5);
		expect(next(2)).toEqual([6, 7]);
	});
	it('goes on behind the last run of this device, and comes back for what was passed over', () => {
		const { scribe, seam, next } = scene(12);
		scribe.drive(seam, 6, 10);
		expect(next()).toEqual([11, 12]);
		scribe.drive(seam, 11, 12);
		expect(next()).toEqual([1, 2, 3, 4, 5]);
	});
	it('is not moved by what somebody else drives elsewhere, only around it', () => {
		const { scribe, seam, next } = scene();
		scribe.drive(seam, 1, 5);
		scribe.drive(seam, 7, 8, { author: JO });
		expect(next(2)).toEqual([6, 9]);
	});
	it('moves back when the last run is undone', () => {
		const { scribe, seam, next } = scene();
		scribe.drive(seam, 1, 5);
		const run = scribe.drive(seam, 6, 10);
		scribe.strike(run);
		expect(next()).toEqual([6, 7, 8, 9, 10]);
	});
	it('passes over holes left open, contested and planned to stay open', () => {
		const { scribe, seam, next } = scene(10, {
			overrides: { [idOf(7)]: { holes: [{ from: 3, to: 3 }], leaveOpen: 'the antenna' } }
		});
		scribe.write('holes.left_open', { holes: [{ from: 2, to: 2 }], reason: 'no bar' }, { seam });
		scribe.drive(seam, 4, 4, { author: JO });
		scribe.write('holes.drilled_out', { holes: [{ from: 4, to: 4 }] }, { seam });
		expect(next()).toEqual([1, 5, 6, 7, 8]);
	});
	it('stays within its row; the rest of the row is the rest of this row', () => {
		const { scribe, seam, next } = scene(20, { pattern: 'rows', rows: 2 });
		scribe.drive(seam, 1, 7);
		expect(next(5)).toEqual([8, 9, 10]);
		expect(next('row')).toEqual([8, 9, 10]);
		scribe.drive(seam, 8, 10);
		expect(next('row')).toEqual([11, 12, 13, 14, 15, 16, 17, 18, 19, 20]);
	});
	it('stops where another rivet is planned', () => {
		const { next } = scene(10, {
			callout: 'MS20470AD4-4',
			overrides: { [idOf(7)]: { holes: [{ from: 4, to: 6 }], callout: 'MS20470AD4-5' } }
		});
		expect(next(5)).toEqual([1, 2, 3]);
	});
	it('offers drilled-out holes when nothing else is open, and nothing when all is done', () => {
		const { scribe, seam, next } = scene(5);
		const run = scribe.drive(seam, 1, 5);
		expect(next()).toEqual([]);
		const out = scribe.write(
			'holes.drilled_out',
			{ holes: [{ from: 2, to: 3 }] },
			{ seam, on: [run] }
		);
		expect(next()).toEqual([2, 3]);
		scribe.drive(seam, 2, 3, { on: [out] });
		expect(next()).toEqual([]);
	});
});

describe('picking', () => {
	it('one tap begins the run there, a second makes it exactly that range, either way round', () => {
		const { scribe, seam, next } = scene();
		scribe.drive(seam, 12, 12);
		expect(next(2, { first: at(11) })).toEqual([11, 13]);
		expect(next(2, { first: at(14), last: at(10) })).toEqual([10, 11, 13, 14]);
	});
	it('never offers to drive what is driven, and names it for a defect', () => {
		const { scribe, seam, fold } = scene();
		scribe.drive(seam, 1, 5);
		const run = nextRun(fold(), 5, DEVICE, { first: at(3) });
		expect(run.drive).toEqual([]);
		expect(numbersOf(run.rivets)).toEqual([3]);
	});
	it('a left-open hole that was picked can be closed', () => {
		const { scribe, seam, next } = scene();
		scribe.write('holes.left_open', { holes: [{ from: 2, to: 2 }], reason: 'no bar' }, { seam });
		expect(next(5, { first: at(2) })).toEqual([2]);
	});
});

describe('what a run writes', () => {
	it('stands on what was known of its holes and says the callout as used', () => {
		const { scribe, seam, fold } = scene(10, { callout: 'MS20470AD4-4' });
		const left = scribe.write(
			'holes.left_open',
			{ holes: [{ from: 2, to: 2 }], reason: 'no bar' },
			{ seam }
		);
		const folded = fold();
		expect(drivenDrafts(folded, folded.holes.slice(0, 3), { bucker: JO })).toEqual([
			{
				kind: 'holes.driven',
				seam,
				on: [left.id],
				body: {
					holes: [{ from: 1, to: 3 }],
					method: 'driven',
					callout: 'MS20470AD4-4',
					bucker: JO
				}
			}
		]);
	});
	it('is a line for each callout and method among them', () => {
		const { fold } = scene(6, {
			callout: 'MS20470AD4-4',
			overrides: { [idOf(7)]: { holes: [{ from: 4, to: 6 }], method: 'pulled', callout: 'CR3213' } }
		});
		const folded = fold();
		expect(drivenDrafts(folded, folded.holes, {}).map(({ body }) => body)).toEqual([
			{ holes: [{ from: 1, to: 3 }], method: 'driven', callout: 'MS20470AD4-4' },
			{ holes: [{ from: 4, to: 6 }], method: 'pulled', callout: 'CR3213' }
		]);
	});
});

describe('undo', () => {
	it('strikes the last line of this person and device that is not struck', () => {
		const { scribe, seam, fold } = scene();
		const first = scribe.drive(seam, 1, 5);
		const second = scribe.drive(seam, 6, 10, { at: '2026-03-14T20:16:00.000+01:00' });
		scribe.drive(seam, 11, 15, { author: JO });
		const undo = () => lastWritten(fold(), ANA, DEVICE);
		expect(undo().map(({ id }) => id)).toEqual([second.id]);
		expect(undoDrafts(seam, undo())).toEqual([
			{ kind: 'entry.struck', seam, on: [second.id], body: { entry: second.id, reason: 'undo' } }
		]);
		scribe.strike(second);
		expect(undo().map(({ id }) => id)).toEqual([first.id]);
		scribe.strike(first);
		expect(undo()).toEqual([]);
	});
	it('takes back what was written in one act together', () => {
		const { scribe, seam, fold } = scene();
		scribe.drive(seam, 1, 5, { at: '2026-03-14T20:10:00.000+01:00' });
		const out = scribe.write('holes.drilled_out', { holes: [{ from: 2, to: 2 }] }, { seam });
		const again = scribe.drive(seam, 2, 2, { on: [out] });
		expect(lastWritten(fold(), ANA, DEVICE).map(({ id }) => id)).toEqual([out.id, again.id]);
	});
});

describe('where holes are drawn', () => {
	it('in rows, the second on the way back when numbered back and forth', () => {
		const { fold } = scene(6, { pattern: 'rows', rows: 2, numbering: 'back_and_forth' });
		expect(layoutOf(fold()).places.map(({ x, y }) => [x, y])).toEqual([
			[0, 0],
			[2, 0],
			[4, 0],
			[4, 1],
			[2, 1],
			[0, 1]
		]);
	});
	it('half a pitch apart when staggered', () => {
		const { fold } = scene(4, { pattern: 'rows', rows: 2, layout: 'staggered' });
		const layout = layoutOf(fold());
		expect(layout.places.map(({ x, y }) => [x, y])).toEqual([
			[0, 0],
			[2, 0],
			[1, 1],
			[3, 1]
		]);
		expect(layout).toMatchObject({ width: 5, height: 2 });
	});
});
