/** Roles of a build, for people: what each is called and what it may do. */
import type { Role } from '$lib/logbook/kinds';

export const ROLE_MAY: Readonly<Record<Role, string>> = {
	owner: 'plans, drives, brings in the crew and answers for the log',
	builder: 'plans, drives and bucks, logs, puts defects right',
	inspector:
		'logs like a builder, decides on defects and signs what was seen; not an airworthiness approval',
	follower: 'sees progress and writes notes'
};

/** Those that can be given; the owner hands the build over instead. */
export const GIVEN_ROLES: readonly Exclude<Role, 'owner'>[] = ['builder', 'inspector', 'follower'];
