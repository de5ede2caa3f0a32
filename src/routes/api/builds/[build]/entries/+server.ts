import { PullQuery, PushRequest } from '$lib/logbook/wire';
import { answerAsked, answerPosted } from '$lib/server/log/http';
import { pull } from '$lib/server/log/pull';
import { push } from '$lib/server/log/push';
import type { RequestHandler } from './$types';

export const GET: RequestHandler = (event) => answerAsked(event, PullQuery, pull);
export const POST: RequestHandler = (event) => answerPosted(event, PushRequest, push);
