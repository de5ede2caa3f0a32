/** Between the routes and the functions of the log: who asks, for which build, with what; and how it is answered. */
import { json } from '@sveltejs/kit';
import type { RequestEvent } from '@sveltejs/kit';
import * as z from 'zod/mini';
import type { RefusalCode } from '$lib/logbook/refusals';
import { Id } from '$lib/logbook/scalars';
import { MOST_PUSHED_BYTES } from '$lib/logbook/wire';
import { refuse } from '../answer';
import { getLog } from './log-server';
import type { LogServer } from './log-server';

type Answer = object | RefusalCode;
type Act<R> = (server: LogServer, actor: string, build: string, request: R) => Promise<Answer>;

/** For a GET that takes no query; a later client may send one that this server does not know. */
export const NoQuery = z.object({});

/** Answers a GET about the build in the address; `schema` reads the query. */
export function answerAsked<R>(
	event: RequestEvent<{ build: string }>,
	schema: z.ZodMiniType<R>,
	act: Act<R>
): Promise<Response> {
	const query = z.safeParse(schema, Object.fromEntries(event.url.searchParams));
	return answerFor(event, query.success ? query.data : 'request.malformed', act);
}

/** Answers a POST about the build in the address; `schema` reads the body. */
export async function answerPosted<R extends object>(
	event: RequestEvent<{ build: string }>,
	schema: z.ZodMiniType<R>,
	act: Act<R>
): Promise<Response> {
	return answerFor(event, await readBody(event.request, schema), act);
}

async function answerFor<R>(
	event: RequestEvent<{ build: string }>,
	request: R | RefusalCode,
	act: Act<R>
): Promise<Response> {
	if (typeof request === 'string') return answer(event, request as RefusalCode);
	const { build } = event.params;
	// What cannot be a build is answered like one that is not there.
	if (!z.safeParse(Id, build).success) return answer(event, 'build.unknown');
	return answer(event, await act(getLog(), personOf(event), build, request));
}

export function answer({ locals }: Pick<RequestEvent, 'locals'>, result: Answer): Response {
	return typeof result === 'string'
		? refuse(result, { requestId: locals.requestId })
		: json(result);
}

/** The signed-in person; the guard lets nobody else through. */
export function personOf({ locals }: Pick<RequestEvent, 'locals'>): string {
	if (locals.person === null) throw new Error('the route is not guarded');
	return locals.person.id;
}

/** The body of a request, counted as it comes: what a caller says about its length may be a lie. */
export async function readBody<R extends object>(
	request: Request,
	schema: z.ZodMiniType<R>
): Promise<R | RefusalCode> {
	const chunks: Uint8Array[] = [];
	let length = 0;
	try {
		for await (const chunk of request.body ?? []) {
			length += chunk.byteLength;
			// The rest is read and dropped, up to the limit of the server script: who is cut off while sending hears
			// no answer, takes it for a broken network and sends the same again.
			if (length > MOST_PUSHED_BYTES) chunks.length = 0;
			else chunks.push(chunk);
		}
	} catch {
		return length > MOST_PUSHED_BYTES ? 'request.too_large' : 'request.malformed';
	}
	if (length > MOST_PUSHED_BYTES) return 'request.too_large';
	try {
		const text = new TextDecoder('utf-8', { fatal: true }).decode(Buffer.concat(chunks, length));
		const body = z.safeParse(schema, JSON.parse(text));
		return body.success ? body.data : 'request.malformed';
	} catch {
		return 'request.malformed';
	}
}
