import { QuarantineDecision } from '$lib/logbook/wire';
import { answerAsked, answerPosted, NoQuery } from '$lib/server/log/http';
import { decideQuarantine, listQuarantine } from '$lib/server/log/quarantine';
import type { RequestHandler } from './$types';

export const GET: RequestHandler = (event) =>
	answerAsked(event, NoQuery, (server, actor, build) => listQuarantine(server, actor, build));
export const POST: RequestHandler = (event) =>
	answerPosted(event, QuarantineDecision, decideQuarantine);
