import { answer, personOf } from '$lib/server/log/http';
import { getLog } from '$lib/server/log/log-server';
import { myBuilds } from '$lib/server/log/builds';
import type { RequestHandler } from './$types';

/** The builds of the signed-in person. */
export const GET: RequestHandler = async (event) =>
	answer(event, await myBuilds(getLog(), personOf(event)));
