/** Who can shoot and buck: the crew by name, and helpers without an account. */
import type { CrewMember } from '$lib/logbook/wire';
import type { Build } from '$lib/logbook/fold/build';

export interface Hand {
	readonly id: string;
	readonly name: string;
}

/** Crew members who have not left, then named helpers; the person of this store is always among them. */
export function handsOf(
	crew: readonly CrewMember[],
	build: Pick<Build, 'named'>,
	self: { readonly person: string; readonly name: string }
): Hand[] {
	const members = crew
		.filter(({ left, role }) => left !== true && role !== 'follower')
		.map(({ person, name }) => ({ id: person, name: name || 'somebody who left' }));
	const own = members.some(({ id }) => id === self.person)
		? []
		: [{ id: self.person, name: self.name || 'me' }];
	return [...own, ...members, ...[...build.named].map(([id, name]) => ({ id, name }))];
}

/** The name of anybody a line may name; members who left keep theirs. */
export function nameOf(
	id: string,
	crew: readonly CrewMember[],
	build: Pick<Build, 'named'>,
	self?: { readonly person: string; readonly name: string }
): string {
	const member = crew.find(({ person }) => person === id);
	// An account that is gone has no name any more.
	if (member) return member.name || 'somebody who left';
	const helper = build.named.get(id);
	if (helper !== undefined) return helper;
	if (self && self.person === id) return self.name || 'you';
	return 'somebody';
}
