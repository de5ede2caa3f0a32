import { expect, test } from 'vitest';
import { idMaker } from './id';
import { Id } from './scalars';

const chance = (bytes: Uint8Array<ArrayBuffer>) => crypto.getRandomValues(bytes);

test('ids are UUID v7 and grow, also within a millisecond and past 4096 of them', () => {
	const newId = idMaker(() => 1_800_000_000_000, chance);
	const ids = Array.from({ length: 10_000 }, newId);
	expect(ids.every((id) => Id.safeParse(id).success)).toBe(true);
	expect([...ids].sort()).toEqual(ids);
	expect(new Set(ids).size).toBe(ids.length);
});

test('a clock that steps back a little does not turn the order, one that was set is followed', () => {
	let at = 1_800_000_000_000;
	const newId = idMaker(() => at, chance);
	const first = newId();
	at -= 500;
	const second = newId();
	at -= 3_600_000;
	const third = newId();
	expect(second > first).toBe(true);
	expect(third < first).toBe(true);
});

test('a clock that is no clock still gives an id', () => {
	for (const now of [-5, 0, 2 ** 60, 12.5])
		expect(Id.safeParse(idMaker(() => now, chance)()).success).toBe(true);
});
