/**
 * The crew of a build. Changes are the owner's, online only, and become lines that the server writes in the owner's
 * name: from those lines alone anybody can tell later who was allowed to write what.
 */
import * as z from 'zod/mini';
import type { Role } from '$lib/logbook/kinds';
import type { RefusalCode } from '$lib/logbook/refusals';
import { Id, Role as RoleName } from '$lib/logbook/scalars';
import type { CrewMember } from '$lib/logbook/wire';
import { emailKey } from '../auth/email';
import { write } from '../write';
import { Journal } from './journal';
import type { LogServer } from './log-server';
import { crewRefusal, ownerRefusal } from './membership';
import { writeServerLines } from './server-lines';
import type { ServerLine } from './server-lines';

export interface CrewAnswer {
	crew: CrewMember[];
}

/** What the owner may ask for: somebody comes in, changes role, or goes. */
export const CrewRequest = z.union([
	z.strictObject({ email: z.string().check(z.maxLength(254)), role: z.string() }),
	z.strictObject({ person: Id, role: RoleName }),
	z.strictObject({ person: Id, remove: z.literal(true) })
]);
export type CrewRequest = z.output<typeof CrewRequest>;

const CREW_ROLES: readonly string[] = ['builder', 'inspector', 'follower'] satisfies Role[];

/** Everybody who is or was in the crew, with the names of their accounts. */
export async function readCrew(
	{ db }: LogServer,
	actor: string,
	build: string
): Promise<CrewAnswer | RefusalCode> {
	const refused = await crewRefusal(db, build, actor);
	if (refused) return refused;
	const rows = await db
		.selectFrom('member')
		.leftJoin('person', 'person.id', 'member.person')
		.select(['member.person', 'person.name', 'role', 'left'])
		.where('build', '=', build)
		.orderBy('member.person')
		.execute();
	return {
		crew: rows.map(({ person, name, role, left }) => ({
			person,
			// An account that is gone, or one of another server whose log was brought here.
			name: name ?? '',
			role,
			...(left === 1 && { left: true })
		}))
	};
}

/** Does what the owner asks and answers with the crew as it is then. */
export function changeCrew(
	server: LogServer,
	actor: string,
	build: string,
	request: CrewRequest
): Promise<CrewAnswer | RefusalCode> {
	if ('email' in request) return addMember(server, actor, build, request.email, request.role);
	return 'role' in request
		? changeRole(server, actor, build, request.person, request.role)
		: removeMember(server, actor, build, request.person);
}

/** Brings in somebody who has an account; one who left comes back this way too. */
export async function addMember(
	server: LogServer,
	actor: string,
	build: string,
	email: string,
	role: string
): Promise<CrewAnswer | RefusalCode> {
	if (!isCrewRole(role)) return 'crew.role_unknown';
	const person = await server.db
		.selectFrom('person')
		.select('id')
		.where('email_key', '=', emailKey(email))
		.executeTakeFirst();
	return act(server, actor, build, (journal) => {
		if (person === undefined) return 'crew.no_account';
		const member = journal.member(person.id);
		if (member && !member.left) return 'crew.already_in';
		return [{ kind: 'crew.joined', body: { person: person.id, role } }];
	});
}

/** Gives a member another role; the role of owner is handed over, and whoever had it stays as a builder. */
export function changeRole(
	server: LogServer,
	actor: string,
	build: string,
	person: string,
	role: Role
): Promise<CrewAnswer | RefusalCode> {
	return act(server, actor, build, (journal) => {
		const member = journal.member(person);
		if (!member || member.left) return 'crew.not_in';
		if (member.role === role) return [];
		if (role === 'owner') return [{ kind: 'owner.changed', body: { from: actor, to: person } }];
		if (isLastOwner(journal, person)) return 'crew.last_owner';
		return [{ kind: 'crew.role', body: { person, role } }];
	});
}

/** Takes somebody out of the crew. What they wrote stays; what they still send waits for the owner. */
export function removeMember(
	server: LogServer,
	actor: string,
	build: string,
	person: string
): Promise<CrewAnswer | RefusalCode> {
	return act(server, actor, build, (journal) => {
		const member = journal.member(person);
		if (!member || member.left) return 'crew.not_in';
		if (isLastOwner(journal, person)) return 'crew.last_owner';
		return [{ kind: 'crew.left', body: { person } }];
	});
}

function isCrewRole(role: string): role is Exclude<Role, 'owner'> {
	return CREW_ROLES.includes(role);
}

function isLastOwner(journal: Journal, person: string): boolean {
	return journal.role(person) === 'owner' && journal.ownersInCrew() === 1;
}

/** Writes what `decide` says. It decides inside the transaction: of two owners who act at once one comes second. */
async function act(
	server: LogServer,
	actor: string,
	build: string,
	decide: (journal: Journal) => readonly ServerLine[] | RefusalCode
): Promise<CrewAnswer | RefusalCode> {
	const outcome = await write(server.db, async (trx) => {
		const journal = await Journal.open(trx, build);
		const refused = ownerRefusal(journal, actor);
		if (refused !== undefined || journal === undefined) return refused ?? 'build.unknown';
		const lines = decide(journal);
		if (typeof lines === 'string') return lines;
		if (lines.length > 0) {
			await journal.loadCrew();
			await journal.lookUpDevices([server.key.device]);
			writeServerLines(server.key, journal, actor, lines);
			await journal.flush();
		}
		return journal.place;
	});
	if (typeof outcome === 'string') return outcome;
	server.live.headMoved(build, outcome.seq);
	server.live.crewChanged();
	return readCrew(server, actor, build);
}
