import { changeCrew, CrewRequest, readCrew } from '$lib/server/log/crew';
import { answerAsked, answerPosted, NoQuery } from '$lib/server/log/http';
import type { RequestHandler } from './$types';

export const GET: RequestHandler = (event) => answerAsked(event, NoQuery, readCrew);
export const POST: RequestHandler = (event) => answerPosted(event, CrewRequest, changeCrew);
