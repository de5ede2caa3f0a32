import { describe, expect, it } from 'vitest';
import { ANA, idOf, JO, Scribe } from '../../../../tests/support/scribe';
import type { Draft } from '$lib/device/append';
import { foldSeam, type Defect, type Finding } from '$lib/logbook/fold/seam';
import {
	defectDrafts,
	drilledOutDrafts,
	fixDrafts,
	isHoleFinding,
	leftOpenDrafts,
	settleDrafts,
	type HoleFinding
} from './drafts';
import { drivenDrafts, lastWritten, undoDrafts } from './run';

function scene(count = 10) {
	const scribe = new Scribe();
	const seam = scribe.seam(count);
	const fold = () => foldSeam(seam, scribe.lines);
	/** Writes drafts as the store would: with the ids they were given. */
	const write = (drafts: readonly Draft[]) => {
		for (const { kind, body, on = [], id } of drafts)
			scribe.write(kind, body, {
				seam,
				on: scribe.lines.filter((line) => on.includes(line.id)),
				...(id !== undefined && { id })
			});
	};
	let ids = 0xbeef;
	return { scribe, seam, fold, write, newId: () => idOf(ids++) };
}
const finding = (findings: readonly Finding[]) => findings.find(isHoleFinding) as HoleFinding;

describe('a defect', () => {
	it('stands on the rivet and does not change what the hole is', () => {
		const { scribe, seam, fold, write } = scene();
		const run = scribe.drive(seam, 1, 5);
		const [draft] = defectDrafts(fold(), fold().holes.slice(2, 3), 'tipped');
		expect(draft?.on).toEqual([run.id]);
		write(defectDrafts(fold(), fold().holes.slice(2, 3), 'tipped'));
		expect(fold().holes[2]).toMatchObject({ state: 'driven' });
		expect(fold().holes[2]?.defects).toHaveLength(1);
	});

	it('is settled by a replaced rivet: drilled out, driven and the fix, in one act', () => {
		const { scribe, seam, fold, write, newId } = scene();
		scribe.drive(seam, 1, 5);
		write(defectDrafts(fold(), fold().holes.slice(2, 3), 'tipped'));
		const [defect] = fold().defects as [Defect];
		const drafts = fixDrafts(
			fold(),
			defect,
			fold().holes.slice(2, 3),
			{ action: 'replaced' },
			{},
			newId
		);
		expect(drafts.map(({ kind }) => kind)).toEqual([
			'holes.drilled_out',
			'holes.driven',
			'defect.fixed'
		]);
		write(drafts);
		expect(fold().findings).toEqual([]);
		expect(fold().holes[2]).toMatchObject({ state: 'driven', defects: [] });
		expect(fold().holes[2]?.heads).toEqual([drafts[1]?.id]);
		// The other holes of the run keep their rivet.
		expect(fold().holes[1]).toMatchObject({ state: 'driven' });
	});

	it('of a hole drilled out before only gets the new rivet', () => {
		const { scribe, seam, fold, write, newId } = scene();
		const run = scribe.drive(seam, 3, 3);
		write(defectDrafts(fold(), fold().holes.slice(2, 3), 'loose'));
		scribe.write('holes.drilled_out', { holes: [{ from: 3, to: 3 }] }, { seam, on: [run] });
		const [defect] = fold().defects as [Defect];
		const holes = fold().holes.slice(2, 3);
		write(fixDrafts(fold(), defect, holes, { action: 'replaced' }, {}, newId));
		expect(fold().findings).toEqual([]);
		expect(fold().holes[2]).toMatchObject({ state: 'driven', defects: [] });
	});

	it('left as is says on what it was decided, and is settled', () => {
		const { scribe, seam, fold, write, newId } = scene();
		scribe.drive(seam, 1, 5);
		write(defectDrafts(fold(), fold().holes.slice(0, 1), 'smile'));
		const [defect] = fold().defects as [Defect];
		const holes = fold().holes.slice(0, 1);
		const fix = { action: 'left_as_is', basis: 'drawings' } as const;
		write(fixDrafts(fold(), defect, holes, fix, {}, newId));
		expect(fold().defects[0]?.holes[0]?.state).toBe('settled');
	});
});

describe('settling', () => {
	it('strikes the other line and names the kept one, where it says nothing else', () => {
		const { scribe, seam, fold, write } = scene();
		const kept = scribe.drive(seam, 1, 5);
		const other = scribe.drive(seam, 4, 5, { author: JO });
		const drafts = settleDrafts(fold(), finding(fold().findings), kept, () => true);
		expect(drafts).toMatchObject([
			{ kind: 'entry.struck', body: { entry: other.id, reason: 'logged_twice', keeps: kept.id } }
		]);
		write(drafts);
		expect(fold().findings).toEqual([]);
		expect(fold().holes.filter(({ state }) => state === 'driven')).toHaveLength(5);
	});

	it('never takes rivets away that the other line alone speaks of', () => {
		const { scribe, seam, fold, write } = scene();
		const kept = scribe.drive(seam, 1, 5);
		scribe.drive(seam, 4, 8, { author: JO });
		const drafts = settleDrafts(fold(), finding(fold().findings), kept, () => true);
		expect(drafts.map(({ kind }) => kind)).toEqual(['holes.driven']);
		write(drafts);
		expect(fold().findings).toEqual([]);
		expect(fold().holes.filter(({ state }) => state === 'driven')).toHaveLength(8);
	});

	it('a contested hole is what the line says that was found true, and credit stays with its author', () => {
		const { scribe, seam, fold, write } = scene();
		const run = scribe.drive(seam, 1, 5);
		scribe.write('holes.drilled_out', { holes: [{ from: 2, to: 2 }] }, { seam, on: [run] });
		const again = scribe.drive(seam, 2, 2, { on: [run], author: JO });
		expect(fold().holes[1]?.state).toBe('contested');
		const drafts = settleDrafts(fold(), finding(fold().findings), again, () => true);
		expect(drafts).toMatchObject([{ kind: 'holes.driven', body: { shooter: JO } }]);
		write(drafts);
		expect(fold().findings).toEqual([]);
		expect(fold().holes[1]?.state).toBe('driven');
	});
});

describe('an act over more holes than one line can stand on', () => {
	/** Two thousand holes, each driven in a line of its own: more than twice what `on` may name. */
	function long() {
		const all = scene(2000);
		for (let hole = 1; hole <= 2000; hole++) all.scribe.drive(all.seam, hole, hole);
		return all;
	}
	/** Each is a sound line: so many causes, ranges and bytes as one may have. */
	function sound({ scribe, seam }: ReturnType<typeof scene>, drafts: readonly Draft[]): boolean[] {
		return drafts.map(
			({ kind, body, on = [], id }) =>
				scribe.read(kind, body, {
					seam,
					on: scribe.lines.filter((line) => on.includes(line.id)),
					...(id !== undefined && { id })
				}).ok
		);
	}
	const note = '鋲'.repeat(2000);

	it('is several sound lines that name every hole once', () => {
		const all = long();
		const { holes } = all.fold();
		for (const drafts of [
			defectDrafts(all.fold(), holes, 'tipped', note),
			leftOpenDrafts(all.fold(), holes, 'the bar does not go in'),
			drilledOutDrafts(all.fold(), holes, 'wrong rivet'),
			drivenDrafts(all.fold(), holes, {})
		]) {
			expect(drafts.length).toBeGreaterThan(2);
			expect(sound(all, drafts).every(Boolean)).toBe(true);
			const named = drafts.flatMap(({ body }) => body.holes.map(({ from, to }) => to - from + 1));
			expect(named.reduce((sum, count) => sum + count, 0)).toBe(2000);
			expect(new Set(drafts.flatMap(({ on }) => on ?? [])).size).toBe(2000);
		}
	});

	it('takes ranges that lie apart into account too', () => {
		const all = scene(2000);
		const apart = all.fold().holes.filter(({ index }) => index % 2 === 1);
		const drafts = leftOpenDrafts(all.fold(), apart, 'no rivet of this length here');
		expect(drafts.length).toBeGreaterThan(2);
		expect(sound(all, drafts).every(Boolean)).toBe(true);
	});

	it('stays one line where it fits', () => {
		const all = scene(400);
		for (let hole = 1; hole <= 400; hole++) all.scribe.drive(all.seam, hole, hole);
		expect(defectDrafts(all.fold(), all.fold().holes, 'tipped')).toHaveLength(1);
	});

	it('is put right for all its holes, and undone in one act', () => {
		const all = long();
		const { scribe, fold, write, newId } = all;
		write(defectDrafts(fold(), fold().holes, 'tipped'));
		expect(fold().holes.every(({ defects }) => defects.length === 1)).toBe(true);
		const [defect] = fold().defects as [Defect, ...Defect[]];
		const keys = new Set(defect.holes.map(({ key }) => key));
		const holes = fold().holes.filter(({ key }) => keys.has(key));
		const before = fold().holes.map(({ state, defects }) => `${state} ${defects.join()}`);
		const drafts = fixDrafts(fold(), defect, holes, { action: 'replaced', note }, {}, newId);
		expect(drafts.length % 3).toBe(0);
		expect(sound(all, drafts).every(Boolean)).toBe(true);

		scribe.now = '2026-03-14T20:16:00.000+01:00';
		write(drafts);
		expect(fold().findings).toEqual([]);
		expect(fold().holes.filter(({ key, defects }) => keys.has(key) && defects.length > 0)).toEqual(
			[]
		);
		const last = lastWritten(fold(), ANA, idOf(0xd0));
		expect(last).toHaveLength(drafts.length);
		write(undoDrafts(all.seam, last));
		expect(fold().holes.map(({ state, defects }) => `${state} ${defects.join()}`)).toEqual(before);
	});
});
