/**
 * The way to the server. Everything that comes back is checked here, once; what cannot be read counts as no answer:
 * a captive portal, a proxy's error page or a dead server must never look like "signed out" or "refused".
 */
import * as z from 'zod/mini';
import type { Place } from '$lib/logbook/chain';
import { sentence } from '$lib/logbook/refusals';
import {
	BuildsAnswer,
	CrewAnswer,
	ErrorAnswer,
	HaveAnswer,
	LiveMessage,
	PAGE,
	PERSON_HEADER,
	PullAnswer,
	PushAnswer,
	PushResult,
	QuarantineAnswer,
	type CrewMember,
	type PushRequest,
	type QuarantinedLine
} from '$lib/logbook/wire';

const DecisionAnswer = z.object({ results: z.array(PushResult) });

export type Listed = z.output<typeof BuildsAnswer>['builds'][number];

/**
 * What a round needs of a server. Every call ends within a bounded time, with an answer of the right shape or by
 * throwing {@link Unreachable} or {@link Refused}.
 */
export interface Transport {
	builds: () => Promise<readonly Listed[]>;
	pull: (build: string, after: Place, limit?: number) => Promise<PullAnswer>;
	push: (build: string, request: PushRequest) => Promise<PushAnswer>;
	/** Which of these lines the server has neither in its log nor held. At most 5000 ids. */
	have: (build: string, ids: readonly string[]) => Promise<readonly string[]>;
	crew: (build: string) => Promise<readonly CrewMember[]>;
	quarantine: (build: string) => Promise<readonly QuarantinedLine[]>;
	/** The owner's word on quarantined lines; what became of each. */
	decide: (
		build: string,
		ids: readonly string[],
		decision: 'accept' | 'discard'
	) => Promise<readonly PushResult[]>;
	/** @returns the function that ends the stream */
	live: (listener: LiveListener) => () => void;
}

interface LiveListener {
	message: (message: z.output<typeof LiveMessage>) => void;
	/** The stream ended for good; somebody has to open another. */
	closed: () => void;
}

/** No usable answer. It may have been carried out all the same; everything that is offered may be offered again. */
export class Unreachable extends Error {
	override name = 'Unreachable';
	constructor(
		/** network: nothing came. timeout: not in time. answer: not ours, or not to be read. server: it failed (5xx). */
		readonly reason: 'network' | 'timeout' | 'answer' | 'server',
		readonly status?: number,
		/** Our own code in a 5xx answer. */
		readonly code?: string,
		options?: ErrorOptions
	) {
		super(code === undefined ? reason : sentence(code), options);
	}
}

/** Our own server said no, in our own words. */
export class Refused extends Error {
	override name = 'Refused';
	constructor(
		readonly status: number,
		readonly code: string
	) {
		super(sentence(code));
	}
}

/** Longer than a healthy server ever takes; short enough that a hanging one is noticed. */
const TIMEOUT = 15_000;

/** The real server, over HTTP, on behalf of the person whose store sends. */
export function httpTransport(
	person: string,
	request: typeof fetch = (...args) => fetch(...args)
): Transport {
	const call = async <T extends z.core.$ZodType>(
		path: string,
		shape: T,
		body?: unknown
	): Promise<z.output<T>> => {
		const headers: Record<string, string> = { [PERSON_HEADER]: person, accept: 'application/json' };
		if (body !== undefined) headers['content-type'] = 'application/json';
		let answer: Response;
		let text: string;
		try {
			answer = await request(`/api/${path}`, {
				method: body === undefined ? 'GET' : 'POST',
				headers,
				...(body !== undefined && { body: JSON.stringify(body) }),
				credentials: 'same-origin',
				cache: 'no-store',
				// A redirect to a page to sign in would arrive as HTML with status 200.
				redirect: 'manual',
				// Also bounds the reading of the body.
				signal: AbortSignal.timeout(TIMEOUT)
			});
			text = await answer.text();
		} catch (error) {
			const late = error instanceof Error && error.name === 'TimeoutError';
			throw new Unreachable(late ? 'timeout' : 'network', undefined, undefined, { cause: error });
		}
		return readAnswer(answer, text, shape);
	};
	const of = (build: string, what: string) => `builds/${encodeURIComponent(build)}/${what}`;
	return {
		builds: async () => (await call('builds', BuildsAnswer)).builds,
		pull: (build, { seq, link }, limit = PAGE) => {
			const query = new URLSearchParams({ after: String(seq), limit: String(limit) });
			if (seq > 0) query.set('link', link);
			return call(of(build, `entries?${query.toString()}`), PullAnswer);
		},
		push: (build, message) => call(of(build, 'entries'), PushAnswer, message),
		have: async (build, ids) => (await call(of(build, 'have'), HaveAnswer, { ids })).lacking,
		crew: async (build) => (await call(of(build, 'crew'), CrewAnswer)).crew,
		quarantine: async (build) => (await call(of(build, 'quarantine'), QuarantineAnswer)).lines,
		decide: async (build, ids, decision) =>
			(await call(of(build, 'quarantine'), DecisionAnswer, { ids, decision })).results,
		live: (listener) => listen(person, listener)
	};
}

function readAnswer<T extends z.core.$ZodType>(
	answer: Response,
	text: string,
	shape: T
): z.output<T> {
	const { status } = answer;
	const isJson = /^application\/json\b/.test(answer.headers.get('content-type') ?? '');
	let value: unknown;
	try {
		value = isJson ? JSON.parse(text) : undefined;
	} catch {
		value = undefined;
	}
	if (answer.ok && value !== undefined) {
		const parsed = z.safeParse(shape, value);
		if (parsed.success) return parsed.data;
		throw new Unreachable('answer', status, undefined, { cause: parsed.error });
	}
	const refusal = ErrorAnswer.safeParse(value);
	if (!refusal.success) throw new Unreachable(status >= 500 ? 'server' : 'answer', status);
	const { code } = refusal.data;
	if (status >= 500) throw new Unreachable('server', status, code);
	// Only our own word for it means "signed out"; a proxy may answer 401 for reasons of its own.
	if (status === 401 && code !== 'session.none') throw new Unreachable('answer', status, code);
	throw new Refused(status, code);
}

function listen(person: string, listener: LiveListener): () => void {
	const source = new EventSource(`/api/live?person=${encodeURIComponent(person)}`);
	source.onmessage = ({ data }: MessageEvent<unknown>) => {
		if (typeof data !== 'string') return;
		try {
			const message = LiveMessage.safeParse(JSON.parse(data));
			if (message.success) listener.message(message.data);
		} catch {
			// Not ours. The next message, or the next timer, says what this one meant.
		}
	};
	source.onerror = () => {
		// While CONNECTING the browser tries again by itself; CLOSED is for good (a refusal, a proxy's page).
		if (source.readyState === EventSource.CLOSED) listener.closed();
	};
	return () => {
		source.close();
	};
}
