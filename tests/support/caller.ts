/** Somebody who talks to a running server without a browser: keeps the session cookie, sends what it is told to. */
import { PERSON_HEADER, type PushAnswer, type PushRequest } from '../../src/lib/logbook/wire';
import type { TestServer } from '../e2e/server';

type Fields = Record<string, string | undefined>;

/** Long enough for the rules of the server, and nothing anybody would try. */
export const PASSWORD = 'longeron flap gusset';

export class Caller {
	readonly #server: Pick<TestServer, 'url'>;
	readonly #origin: string;
	cookie = '';

	constructor(server: Pick<TestServer, 'url'>, origin = server.url) {
		this.#server = server;
		this.#origin = origin;
	}

	/** Somebody with an account, signed in. */
	static async registered(server: Pick<TestServer, 'url'>, name = 'erna'): Promise<Caller> {
		const caller = new Caller(server);
		const email = `${name}@example.org`;
		const answer = await caller.post('/register', { email, name, password: PASSWORD });
		if (answer.status !== 303) throw new Error(`registering answered ${answer.status}`);
		return caller;
	}

	/** Posts a form from our own page; takes over the cookie that comes back. */
	async post(path: string, fields: Fields, headers: Fields = {}): Promise<Response> {
		const answer = await this.send(path, {
			method: 'POST',
			body: new URLSearchParams(defined(fields)),
			headers: { origin: this.#origin, ...defined(headers) }
		});
		const [set] = answer.headers.getSetCookie();
		if (set !== undefined) this.cookie = set.split(';', 1)[0] ?? '';
		return answer;
	}

	send(path: string, init: RequestInit = {}): Promise<Response> {
		const headers = new Headers(init.headers);
		if (this.cookie !== '') headers.set('cookie', this.cookie);
		return fetch(this.#server.url + path, { ...init, headers, redirect: 'manual' });
	}

	async person(): Promise<{ id: string; name: string; email: string } | undefined> {
		const answer = await this.send('/api/session');
		if (answer.status !== 200) return undefined;
		const { person } = (await answer.json()) as {
			person: { id: string; name: string; email: string } | null;
		};
		return person ?? undefined;
	}

	/** Calls the API as the app does. @throws on anything but 200 */
	async api<T>(person: string, path: string, body?: unknown): Promise<T> {
		const answer = await this.send(`/api/${path}`, {
			method: body === undefined ? 'GET' : 'POST',
			headers: {
				origin: this.#origin,
				'content-type': 'application/json',
				[PERSON_HEADER]: person
			},
			...(body !== undefined && { body: JSON.stringify(body) })
		});
		if (answer.status !== 200) throw new Error(`${path}: ${answer.status} ${await answer.text()}`);
		return (await answer.json()) as T;
	}

	push(person: string, build: string, request: PushRequest): Promise<PushAnswer> {
		return this.api(person, `builds/${build}/entries`, request);
	}
}

function defined(fields: Fields): Record<string, string> {
	return Object.fromEntries(
		Object.entries(fields).filter((field): field is [string, string] => field[1] !== undefined)
	);
}
