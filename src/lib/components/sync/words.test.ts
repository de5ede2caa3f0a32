import { describe, expect, it } from 'vitest';
import { savedIn, syncText, waitsFor } from './words';

const quiet = {
	phase: 'idle' as const,
	waiting: 0,
	held: 0,
	pending: 0,
	refused: 0,
	discarded: 0,
	parked: 0,
	acknowledgedNotBack: 0,
	offeredAgain: 0,
	synced: true,
	lastSuccess: new Date(2026, 2, 14, 21, 42).getTime()
};

describe('the words of the header', () => {
	it('say synced, and when, only when nothing waits anywhere', () => {
		expect(syncText(quiet).words).toBe('synced 21:42');
		expect(syncText({ ...quiet, waiting: 3, synced: false }).words).toBe('waiting 3');
		expect(syncText({ ...quiet, held: 1, synced: false }).words).toBe('held 1');
		expect(syncText({ ...quiet, acknowledgedNotBack: 2, synced: false }).words).toBe('checking');
	});
	it('are quiet offline: the lines are here', () => {
		const offline = { ...quiet, phase: 'offline' as const, synced: false };
		expect(syncText(offline).words).toBe('on this phone');
		expect(syncText({ ...offline, waiting: 3 }).words).toBe('waiting 3');
	});
	it('count lines that were set aside among those waiting', () => {
		expect(syncText({ ...quiet, waiting: 2, parked: 1, synced: false }).words).toBe('waiting 3');
	});
	it('name refused lines beside the state, also when synced', () => {
		expect(syncText({ ...quiet, refused: 1, pending: 1 })).toMatchObject({
			words: 'synced 21:42',
			refused: '2 not accepted'
		});
	});
	it('never call it sending while nothing is to be sent', () => {
		expect(syncText({ ...quiet, phase: 'syncing', waiting: 1, synced: false }).words).toBe(
			'sending'
		);
		expect(syncText({ ...quiet, phase: 'syncing' }).words).not.toBe('sending');
	});
});

it('the bench says where the lines of its build are', () => {
	expect(savedIn(undefined).words).toBe('on this phone');
	expect(savedIn({ ...quiet, waiting: 3, synced: false }).words).toBe('3 waiting');
	expect(savedIn(quiet).words).toBe('synced 21:42');
});

it('the panel says of each build what waits and why', () => {
	const build = {
		...quiet,
		build: '',
		name: '',
		cursor: 0,
		head: 0,
		removed: false,
		synced: false,
		waiting: 1,
		held: 2
	};
	expect(waitsFor(build)).toEqual([
		'1 line is only on this phone.',
		'2 lines held by the server until a line they refer to arrives.'
	]);
});
