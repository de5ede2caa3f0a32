/**
 * Pushes over HTTP with real accounts and seals, into an empty build and into one that already holds a lot; beside them
 * the same requests to the raw server. Everything is written and sealed before the clock starts, and the four servers
 * take turns, so that whatever else the machine does meets all of them.
 */
import { Agent, request } from 'node:http';
import { setTimeout as sleep } from 'node:timers/promises';
import { PERSON_HEADER, type PushAnswer } from '$lib/logbook/wire';
import { TestServer } from '../e2e/server';
import { Caller } from '../support/caller';
import {
	enrol,
	makeDevice,
	openBuild,
	planSeam,
	sealedPush,
	writeLine,
	type TestDevice,
	type TestLine
} from '../support/people';
import { cpuOf, withPid } from './cpu';
import { RawServer } from './raw';
import { atLeast, atMost, ratioOf, spread, type Row } from './report';

export interface PushOptions {
	/** Lines in the build that is not empty. */
	readonly present: number;
	/** Turns each server takes. */
	readonly turns: number;
	readonly cases: readonly PushCase[];
	readonly say: (text: string) => void;
}
export interface PushCase {
	readonly batch: number;
	readonly clients: number;
	/** Pushes of each client in a turn. */
	readonly pushes: number;
}

const MOST_CLIENTS = 8;
const FILL_BATCH = 200;
/** Lines that warm a server up. */
const WARM = 4000;
const SEAM = 5000;
const CALLOUT = 'MS20470AD4-4';

interface Client {
	readonly caller: Caller;
	readonly device: TestDevice;
}

/** A server with one build, a crew and its devices. */
class Crewed {
	readonly server: TestServer;
	readonly pid: number | undefined;
	readonly clients: readonly Client[];
	readonly build: string;
	readonly #seam: string;
	#cursor: PushAnswer['cursor'] | undefined;

	private constructor(
		server: TestServer,
		pid: number | undefined,
		clients: readonly Client[],
		build: string,
		seam: string
	) {
		this.server = server;
		this.pid = pid;
		this.clients = clients;
		this.build = build;
		this.#seam = seam;
	}

	static async make(count: number): Promise<Crewed> {
		const { of: server, pid } = await withPid(() => TestServer.start({ LOG_LEVEL: 'info' }));
		const clients: Client[] = [];
		for (let i = 0; i < count; i++) {
			const caller = await Caller.registered(server, `crew${i}`);
			const person = await caller.person();
			clients.push({ caller, device: await makeDevice(person?.id) });
		}
		const [owner, ...others] = clients;
		if (!owner) throw new Error('a crew has an owner');
		const { build, opened, enrolled } = openBuild(owner.device);
		const { seam, lines } = planSeam(owner.device, build, SEAM);
		const crewed = new Crewed(server, pid, clients, build, seam);
		await crewed.#send(owner, [opened, enrolled, ...lines]);
		for (const other of others) {
			const email = (await other.caller.person())?.email;
			await owner.caller.api(owner.device.author, `builds/${build}/crew`, {
				email,
				role: 'builder'
			});
			other.device.n = owner.device.n + 100;
			await crewed.#send(other, [enrol(other.device, build)]);
		}
		return crewed;
	}

	async #send({ caller, device }: Client, lines: readonly TestLine[]): Promise<void> {
		const more = this.#cursor ? { cursor: this.#cursor } : {};
		const request = await sealedPush(device, this.build, lines, more);
		const { results, cursor } = await caller.push(device.author, this.build, request);
		const bad = results.find(({ status }) => status !== 'accepted');
		if (bad) throw new Error(`${bad.status} ${bad.code ?? ''}`);
		this.#cursor = cursor;
	}

	/** So many lines, as a year of evenings leaves them. */
	async fill(lines: number): Promise<void> {
		for (let sent = 0; sent < lines; sent += FILL_BATCH) {
			const client = this.clients[(sent / FILL_BATCH) % this.clients.length] as Client;
			await this.#send(client, this.#lines(client.device, Math.min(FILL_BATCH, lines - sent)));
		}
	}

	/**
	 * The same work in another build of the same server, so that its code is compiled when the clock starts. A server
	 * just started is several times slower; that is not what grows with a log.
	 */
	async warmUp(): Promise<void> {
		const [owner] = this.clients;
		if (!owner) return;
		const { caller } = owner;
		const device = await makeDevice(owner.device.author);
		const { build, opened, enrolled } = openBuild(device);
		const { seam, lines } = planSeam(device, build, SEAM);
		const other = new Crewed(this.server, this.pid, [{ caller, device }], build, seam);
		await other.#send({ caller, device }, [opened, enrolled, ...lines]);
		await other.fill(WARM);
	}

	/** Three runs driven, then a reading of the last. */
	#lines(device: TestDevice, count: number): TestLine[] {
		const { build } = this;
		const seam = this.#seam;
		let driven: TestLine | undefined;
		return Array.from({ length: count }, (_, i) => {
			const from = 1 + ((device.n * 7) % (SEAM - 3));
			if (i % 4 < 3 || !driven) {
				driven = writeLine(
					device,
					build,
					'holes.driven',
					{
						holes: [{ from, to: from + 2 }],
						method: 'driven',
						callout: CALLOUT,
						shooter: device.author
					},
					{ seam }
				);
				return driven;
			}
			return writeLine(
				device,
				build,
				'reading.taken',
				{ what: { is: 'hole', index: from }, found: { by: 'gauge', size: 'inside' } },
				{ seam, on: [driven.id] }
			);
		});
	}

	/** Pushes of every client of a case, each a body ready to be sent. */
	async prepare({ batch, clients, pushes }: PushCase): Promise<Prepared[][]> {
		const cursor = this.#cursor;
		if (!cursor) throw new Error('nothing was pushed yet');
		return Promise.all(
			this.clients.slice(0, clients).map(async ({ caller, device }) => {
				const prepared: Prepared[] = [];
				for (let i = 0; i < pushes; i++) {
					const lines = this.#lines(device, batch);
					const message = await sealedPush(device, this.build, lines, { cursor });
					prepared.push({
						body: Buffer.from(JSON.stringify(message)),
						headers: {
							'content-type': 'application/json',
							origin: this.server.url,
							cookie: caller.cookie,
							[PERSON_HEADER]: device.author
						}
					});
				}
				return prepared;
			})
		);
	}
}

interface Prepared {
	readonly body: Buffer;
	readonly headers: Readonly<Record<string, string>>;
}

interface Turn {
	/** Ms of each push. */
	readonly pushes: readonly number[];
	/** Ms from the first to the last answer. */
	readonly all: number;
	/** Ms of processor time of the server. */
	readonly cpu: number;
}

/** Every client sends its pushes one after the other, all clients at once. */
async function turn(
	agent: Agent,
	{ url, pid }: { readonly url: string; readonly pid: number | undefined },
	clients: readonly Prepared[][]
): Promise<Turn> {
	const times: number[] = [];
	const answers: string[] = [];
	const used = cpuOf(pid);
	const started = performance.now();
	await Promise.all(
		clients.map(async (prepared) => {
			for (const { body, headers } of prepared) {
				const sent = performance.now();
				answers.push(await post(agent, url, headers, body));
				times.push(performance.now() - sent);
			}
		})
	);
	const all = performance.now() - started;
	for (const answer of answers)
		if (/"status":"(?!accepted")/.test(answer)) throw new Error(answer.slice(0, 300));
	return { pushes: times, all, cpu: cpuOf(pid) - used };
}

function post(
	agent: Agent,
	url: string,
	headers: Readonly<Record<string, string>>,
	body: Buffer
): Promise<string> {
	return new Promise((resolve, reject) => {
		const sent = request(
			url,
			{ agent, method: 'POST', headers: { ...headers, 'content-length': body.length } },
			(answer) => {
				let text = '';
				answer.setEncoding('utf8');
				answer.on('data', (chunk: string) => (text += chunk));
				answer.on('error', reject);
				answer.on('end', () => {
					if (answer.statusCode === 200) resolve(text);
					else reject(new Error(`${answer.statusCode ?? 0} ${text.slice(0, 300)}`));
				});
			}
		);
		sent.on('error', reject);
		sent.end(body);
	});
}

async function fillRaw(raw: RawServer, agent: Agent, lines: number): Promise<void> {
	const text = JSON.stringify({ text: 'x'.repeat(480) });
	for (let sent = 0; sent < lines; sent += FILL_BATCH) {
		const entries = Array.from({ length: Math.min(FILL_BATCH, lines - sent) }, () => text);
		await post(agent, `${raw.url}/lines`, {}, Buffer.from(JSON.stringify({ entries })));
	}
}

export async function push({ present, turns, cases, say }: PushOptions): Promise<Row[]> {
	const agent = new Agent({ keepAlive: true, maxSockets: MOST_CLIENTS });
	const full = await Crewed.make(MOST_CLIENTS);
	const started = Date.now();
	await full.fill(present);
	const rawFull = await RawServer.start();
	await fillRaw(rawFull, agent, present);
	say(`  ${present} entries put on a server in ${((Date.now() - started) / 1000).toFixed(1)} s`);
	const rows: Row[] = [];
	try {
		for (const one of cases) {
			const empty = await Crewed.make(one.clients);
			const raw = await RawServer.start();
			await empty.warmUp();
			await fillRaw(raw, agent, WARM);
			try {
				rows.push(...(await measure(one, turns, present, agent, { empty, raw, full, rawFull })));
			} finally {
				await raw.stop();
				await empty.server.dispose();
			}
			say(`  batch ${one.batch}, ${clientsText(one.clients)}`);
		}
	} finally {
		agent.destroy();
		await rawFull.stop();
		await full.server.dispose();
	}
	return rows;
}

async function measure(
	one: PushCase,
	turns: number,
	present: number,
	agent: Agent,
	{ empty, raw, full, rawFull }: { empty: Crewed; raw: RawServer; full: Crewed; rawFull: RawServer }
): Promise<Row[]> {
	const measured = { empty: [], raw: [], full: [], rawFull: [] } as Record<string, Turn[]> & {
		empty: Turn[];
		raw: Turn[];
		full: Turn[];
		rawFull: Turn[];
	};
	const pushTo = ({ server, pid, build }: Crewed) => ({
		url: `${server.url}/api/builds/${build}/entries`,
		pid
	});
	const rawTo = ({ url, pid }: RawServer) => ({ url: `${url}/lines`, pid });
	// The first turn warms up: compiled code, open connections, read sessions.
	for (let i = -1; i < turns; i++) {
		const [forEmpty, forFull] = [await empty.prepare(one), await full.prepare(one)];
		const order = [
			['empty', () => turn(agent, pushTo(empty), forEmpty)],
			['raw', () => turn(agent, rawTo(raw), forEmpty)],
			['full', () => turn(agent, pushTo(full), forFull)],
			['rawFull', () => turn(agent, rawTo(rawFull), forFull)]
		] as const;
		for (const [name, run] of i % 2 === 0 ? order : order.toReversed()) {
			// What one server still has to write after its answers is not to be paid by the next.
			await sleep(20);
			const result = await run();
			if (i >= 0) measured[name].push(result);
		}
	}
	const lines = one.batch * one.clients * one.pushes;
	const perPush = (of: readonly Turn[]) => spread(of.flatMap((result) => result.pushes));
	const perSecond = (of: readonly Turn[]) =>
		spread(of.map((result) => (lines / result.all) * 1000));
	const cpuPerPush = (of: readonly Turn[]) => {
		const all = of.reduce((sum, { cpu }) => sum + cpu, 0);
		return spread([all / (of.length * one.clients * one.pushes)]);
	};
	const rows: Row[] = [];
	for (const [at, ours, floor] of [
		[0, measured.empty, measured.raw],
		[present, measured.full, measured.rawFull]
	] as const) {
		const name = `push ${one.batch}, ${clientsText(one.clients)}, ${at.toLocaleString('en')} present`;
		const [fast, floorFast] = [perSecond(ours), perSecond(floor)];
		const ratio = ratioOf(fast, floorFast);
		rows.push({
			name,
			unit: 'entries/s',
			tallybar: fast,
			floor: floorFast,
			ratio,
			...(one.batch === 100 && { goal: atLeast(ratio.p50, 0.3, 'p50') }),
			note: `n is turns of ${one.clients * one.pushes} pushes.`
		});
		const [slow, floorSlow] = [perPush(ours), perPush(floor)];
		rows.push({
			name: `${name}: one push`,
			unit: 'ms',
			tallybar: slow,
			floor: floorSlow,
			ratio: ratioOf(slow, floorSlow)
		});
		const [used, floorUsed] = [cpuPerPush(ours), cpuPerPush(floor)];
		rows.push({
			name: `${name}: processor time of one push`,
			unit: 'ms',
			tallybar: used,
			floor: floorUsed,
			ratio: ratioOf(used, floorUsed)
		});
	}
	const [at0, later] = [perPush(measured.empty), perPush(measured.full)];
	const growth = ratioOf(later, at0);
	rows.push({
		name: `push ${one.batch}, ${clientsText(one.clients)}, cost at ${present.toLocaleString('en')} / at 0`,
		unit: 'ms',
		tallybar: later,
		floor: at0,
		ratio: growth,
		goal: atMost(growth.p50, 1.2, 'p50'),
		note: 'The floor of this row is the same product with 0 entries present.'
	});
	return rows;
}

const clientsText = (count: number) => (count === 1 ? '1 client' : `${count} clients`);
