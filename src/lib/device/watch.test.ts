import { describe, expect, it } from 'vitest';
import { listingOf } from './watch.svelte';

const onItsWay = {
	build: 'b',
	name: 'Yarrow',
	role: 'builder' as const,
	removed: false,
	known: true,
	head: 9,
	lines: 9,
	cursor: 9
};
const listing = { ...onItsWay, lastSuccess: 1 };
const fold = (role: 'owner' | 'follower' | 'left') => ({
	name: 'Yarrow Two',
	crew: new Map([['ana', role]])
});

describe('a build as its log says it is', () => {
	it('has the name and the role of the log, which hears of a change first', () => {
		expect(listingOf(listing, fold('follower'), 'ana')).toMatchObject({
			name: 'Yarrow Two',
			role: 'follower'
		});
		expect(listingOf(listing, fold('left'), 'ana')).toMatchObject({ role: null, removed: true });
	});

	it('has the server’s word where the log says nothing of this person, or is not all here yet', () => {
		expect(listingOf(listing, fold('follower'), 'jo').role).toBe('builder');
		expect(listingOf(onItsWay, fold('follower'), 'ana')).toEqual(onItsWay);
		expect(listingOf(listing, undefined, 'ana')).toEqual(listing);
	});

	it('is of whoever opened it here, before any server knows it', () => {
		const local = { ...onItsWay, known: false, role: 'owner' as const };
		expect(listingOf(local, fold('owner'), 'ana').role).toBe('owner');
	});

	it('stays without a role until the server has given one, and left once the server said so', () => {
		expect(listingOf({ ...listing, role: null }, fold('owner'), 'ana').role).toBeNull();
		const gone = { ...listing, role: null, removed: true };
		expect(listingOf(gone, fold('owner'), 'ana')).toMatchObject({ role: null, removed: true });
	});
});
