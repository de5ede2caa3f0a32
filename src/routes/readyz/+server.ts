import { json } from '@sveltejs/kit';
import { config } from '$lib/server/config';
import { getDb } from '$lib/server/db';
import { readiness } from '$lib/server/ready';
import type { RequestHandler } from './$types';

export const GET: RequestHandler = async () => {
	const result = await readiness(getDb(), config().dataDir);
	return json(result, { status: result.ready ? 200 : 503 });
};
