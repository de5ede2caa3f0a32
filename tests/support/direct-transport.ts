/** A transport that calls the functions of the server's log directly, as the person it is for. */
import { refusal, type RefusalCode } from '../../src/lib/logbook/refusals';
import { HaveRequest, PushRequest } from '../../src/lib/logbook/wire';
import { Refused, Unreachable, type Transport } from '../../src/lib/device/transport';
import { myBuilds } from '../../src/lib/server/log/builds';
import { readCrew, removeMember } from '../../src/lib/server/log/crew';
import type { LogServer } from '../../src/lib/server/log/log-server';
import { have, pull } from '../../src/lib/server/log/pull';
import { push } from '../../src/lib/server/log/push';
import { decideQuarantine, listQuarantine } from '../../src/lib/server/log/quarantine';

function said<T>(answer: T | RefusalCode): T {
	if (typeof answer !== 'string') return answer;
	const code = answer as RefusalCode;
	const { status = 400 } = refusal(code);
	if (status >= 500) throw new Unreachable('server', status, code);
	throw new Refused(status, code);
}

export function directTransport(server: LogServer, person: string): Transport {
	return {
		builds: async () => (await myBuilds(server, person)).builds,
		pull: async (build, { seq, link }, limit = 1000) =>
			said(await pull(server, person, build, { after: seq, link, limit })),
		push: async (build, message) => {
			// Through JSON, as on the wire.
			const parsed = PushRequest.safeParse(JSON.parse(JSON.stringify(message)));
			if (!parsed.success) throw new Refused(400, 'request.malformed');
			return said(await push(server, person, build, parsed.data));
		},
		have: async (build, ids) => {
			const parsed = HaveRequest.safeParse({ ids });
			if (!parsed.success) throw new Refused(400, 'request.malformed');
			return said(await have(server, person, build, parsed.data)).lacking;
		},
		crew: async (build) => said(await readCrew(server, person, build)).crew,
		quarantine: async (build) => said(await listQuarantine(server, person, build)).lines,
		decide: async (build, ids, decision) =>
			said(await decideQuarantine(server, person, build, { ids: [...ids], decision })).results,
		live: () => () => undefined
	};
}

/** The owner removes somebody from the crew, online. @throws on a refusal */
export async function removeFromCrew(
	server: LogServer,
	owner: string,
	build: string,
	person: string
): Promise<void> {
	said(await removeMember(server, owner, build, person));
}
