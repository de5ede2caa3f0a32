import { error, fail } from '@sveltejs/kit';
import { z } from 'zod';
import { refusal, type RefusalCode } from '$lib/logbook/refusals';
import { Id, Role } from '$lib/logbook/scalars';
import { field } from '$lib/server/desk-form';
import { myBuilds } from '$lib/server/log/builds';
import { addMember, changeRole, readCrew, removeMember } from '$lib/server/log/crew';
import type { CrewAnswer } from '$lib/server/log/crew';
import { getLog } from '$lib/server/log/log-server';
import { personOf } from '$lib/server/log/http';
import type { Actions, PageServerLoad, RequestEvent } from './$types';

const Addition = z.object({ email: field, role: field });
const Change = z.object({ person: Id, role: Role });
const Removal = z.object({ person: Id });

export const load: PageServerLoad = async (event) => {
	const { build } = event.params;
	const me = personOf(event);
	const answer = Id.safeParse(build).success
		? await readCrew(getLog(), me, build)
		: ('build.unknown' as const);
	if (typeof answer === 'string') {
		const { says, status = 400 } = refusal(answer);
		error(status, { message: says, requestId: event.locals.requestId });
	}
	const { builds } = await myBuilds(getLog(), me);
	const name = builds.find((mine) => mine.build === build)?.name ?? '';
	return { build, name, me, crew: answer.crew };
};

export const actions: Actions = {
	add: async (event) => {
		const { email, role } = await fields(event, Addition);
		const outcome = await addMember(getLog(), personOf(event), event.params.build, email, role);
		return told(outcome, 'add', { email, role });
	},
	role: async (event) => {
		const { person, role } = await fields(event, Change);
		const outcome = await changeRole(getLog(), personOf(event), event.params.build, person, role);
		return told(outcome, person, { email: '', role });
	},
	remove: async (event) => {
		const { person } = await fields(event, Removal);
		const outcome = await removeMember(getLog(), personOf(event), event.params.build, person);
		return told(outcome, person, { email: '', role: '' });
	}
};

/** What was sent, or 400: people and roles come from lists that this page drew. */
async function fields<T extends z.core.$ZodType>(
	{ request, params, locals }: RequestEvent,
	schema: T
): Promise<z.output<T>> {
	const read = z.safeParse(schema, Object.fromEntries(await request.formData()));
	if (read.success && Id.safeParse(params.build).success) return read.data;
	const { says } = refusal('request.malformed');
	error(400, { message: says, requestId: locals.requestId });
}

/** `at`: the form to say it beside, which is `add` or the id of a person. */
function told(
	outcome: CrewAnswer | RefusalCode,
	at: string,
	typed: { email: string; role: string }
) {
	if (typeof outcome !== 'string') return { at, done: true as const };
	const { says, status = 400 } = refusal(outcome);
	return fail(status, { at, says, typed });
}
