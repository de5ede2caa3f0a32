import { HaveRequest } from '$lib/logbook/wire';
import { answerPosted } from '$lib/server/log/http';
import { have } from '$lib/server/log/pull';
import type { RequestHandler } from './$types';

/** Which of these lines does the server lack? */
export const POST: RequestHandler = (event) => answerPosted(event, HaveRequest, have);
