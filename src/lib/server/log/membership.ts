import type { RefusalCode } from '$lib/logbook/refusals';
import type { Db } from '../db';
import type { Journal } from './journal';

/** Why this person may not read this build: unknown alike for strangers and for builds that are not there. */
export async function crewRefusal(
	db: Db,
	build: string,
	person: string
): Promise<RefusalCode | undefined> {
	const member = await db
		.selectFrom('member')
		.select('left')
		.where('build', '=', build)
		.where('person', '=', person)
		.executeTakeFirst();
	if (member === undefined) return 'build.unknown';
	return member.left === 1 ? 'build.removed' : undefined;
}

/** Why this person may not act as the owner of this build, asked inside the transaction of the act. */
export function ownerRefusal(
	journal: Journal | undefined,
	person: string
): RefusalCode | undefined {
	switch (journal?.role(person)) {
		case undefined:
			return 'build.unknown';
		case 'left':
			return 'build.removed';
		case 'owner':
			return undefined;
		default:
			return 'build.owner_only';
	}
}
