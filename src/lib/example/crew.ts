/** The invented crew, and the devices they write on. */
import type { Role } from '$lib/logbook/kinds';

export interface Member {
	readonly id: string;
	readonly name: string;
	readonly role: Role;
}

export interface Device {
	readonly id: string;
	/** Whose it is: a device is enrolled for one person. */
	readonly person: string;
	readonly name: string;
}

/** Of the example, the same on every device: its store is opened as the owner before there is a log. */
export const EXAMPLE_OWNER = '0193e7a1-0000-7000-8000-00000000a001';
export const EXAMPLE_CREW: readonly Member[] = [
	{ id: EXAMPLE_OWNER, name: 'Ana Verhoek', role: 'owner' },
	{ id: '0193e7a1-0000-7000-8000-00000000a002', name: 'Jo Tamsin', role: 'builder' },
	{ id: '0193e7a1-0000-7000-8000-00000000a003', name: 'Piet Aldergrove', role: 'inspector' },
	{ id: '0193e7a1-0000-7000-8000-00000000a004', name: 'Sam Verhoek', role: 'follower' }
];

const NAMES = [
	'Ana Verhoek',
	'Jo Tamsin',
	'Piet Aldergrove',
	'Sam Verhoek',
	'Kit Orrowby',
	'Lena Maddisk',
	'Tor Wexcombe',
	'Ines Quillan'
] as const;
/** After these four, everybody is a builder. */
const ROLES: readonly Role[] = ['owner', 'builder', 'inspector', 'follower'];

export function membersOf(count: number, newId: () => string): Member[] {
	return Array.from({ length: Math.max(1, count) }, (_, i) => {
		const name = NAMES[i % NAMES.length] as string;
		return {
			id: newId(),
			name: i < NAMES.length ? name : `${name} ${Math.floor(i / NAMES.length) + 1}`,
			role: ROLES[i] ?? 'builder'
		};
	});
}

/** The first is the owner's; each person has one before anybody has two. */
export function devicesOf(
	count: number,
	members: readonly Member[],
	newId: () => string
): Device[] {
	return Array.from({ length: Math.max(1, count) }, (_, i) => {
		const { id, name } = members[i % members.length] as Member;
		const first = name.split(' ')[0] ?? name;
		const round = Math.floor(i / members.length);
		return {
			id: newId(),
			person: id,
			name: `${first}’s ${round === 0 ? 'phone' : round === 1 ? 'tablet' : `device ${round + 1}`}`
		};
	});
}
