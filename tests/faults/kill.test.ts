import { setTimeout as sleep } from 'node:timers/promises';
import { join } from 'node:path';
import Sqlite from 'better-sqlite3';
import { next, start, type Accepted } from '../../src/lib/logbook/chain';
import { hashText } from '../../src/lib/logbook/bytes';
import { expect, test, type TestServer } from '../e2e/server';
import { Caller } from '../support/caller';
import {
	driveHoles,
	enrol,
	makeDevice,
	openBuild,
	planSeam,
	sealedPush,
	type TestDevice,
	type TestLine
} from '../support/people';

const KILLS = 20;

interface Client {
	readonly caller: Caller;
	readonly device: TestDevice;
}

async function join4(server: TestServer): Promise<Client[]> {
	const clients: Client[] = [];
	for (const name of ['ana', 'jo', 'kit', 'lou']) {
		const caller = await Caller.registered(server, name);
		const person = await caller.person();
		clients.push({ caller, device: await makeDevice(person?.id) });
	}
	return clients;
}

async function makeBuild([owner, ...others]: Client[]): Promise<{ build: string; seam: string }> {
	if (!owner) throw new Error('a crew has an owner');
	const { device, caller } = owner;
	const { build, opened, enrolled } = openBuild(device);
	const { seam, lines } = planSeam(device, build, 5000);
	await caller.push(
		device.author,
		build,
		await sealedPush(device, build, [opened, enrolled, ...lines])
	);
	for (const other of others) {
		const email = (await other.caller.person())?.email;
		await caller.api(device.author, `builds/${build}/crew`, { email, role: 'builder' });
		other.device.n = 100;
		await other.caller.push(
			other.device.author,
			build,
			await sealedPush(other.device, build, [enrol(other.device, build)])
		);
	}
	return { build, seam };
}

test(`nothing acknowledged is lost or doubled when the server is killed ${KILLS} times under four pushing clients`, async ({
	server
}) => {
	test.setTimeout(300_000);
	const clients = await join4(server);
	const { build, seam } = await makeBuild(clients);

	const acknowledged = new Map<string, string>();
	const attempted = new Set<string>();
	let done = false;
	const run = async ({ caller, device }: Client) => {
		for (let batch = 0; !done; batch++) {
			const lines: TestLine[] = Array.from({ length: 1 + (batch % 30) }, (_, i) =>
				driveHoles(device, build, seam, 1 + ((batch * 31 + i) % 5000))
			);
			for (const { id } of lines) attempted.add(id);
			const request = await sealedPush(device, build, lines);
			// As a phone does: the same lines again until an answer arrives.
			for (;;) {
				try {
					const { results } = await caller.push(device.author, build, request);
					for (const [i, { status }] of results.entries()) {
						expect(['accepted', 'duplicate']).toContain(status);
						acknowledged.set(lines[i]?.id ?? '', lines[i]?.text ?? '');
					}
					break;
				} catch (error) {
					// A refusal would be a finding; a connection cut in the middle is what this is about.
					if (!(error instanceof TypeError)) throw error;
					await sleep(20);
				}
			}
		}
	};
	const running = Promise.all(clients.map(run));
	for (let kill = 0; kill < KILLS; kill++) {
		await sleep(50 + Math.random() * 400);
		await server.kill();
		await server.start();
	}
	done = true;
	await running;
	await server.stop();

	expect(acknowledged.size).toBeGreaterThan(KILLS);
	const db = new Sqlite(join(server.dataDir, 'tallybar.db'), { readonly: true });
	try {
		expect(db.pragma('integrity_check', { simple: true })).toBe('ok');
		expect(db.pragma('foreign_key_check')).toEqual([]);
		type Row = Accepted & { id: string; text: string; link: string };
		const rows = db
			.prepare('select seq, received, hash, id, text, link from entry where build = ? order by seq')
			.all(build) as Row[];
		const stored = new Map(rows.map((row) => [row.id, row.text]));
		const lost = [...acknowledged].filter(([id, text]) => stored.get(id) !== text);
		expect(lost).toEqual([]);
		expect(rows.length - stored.size, 'doubled').toBe(0);
		const driven = rows.filter(({ text }) => text.includes('"holes.driven"'));
		expect(
			driven.filter(({ id }) => !attempted.has(id)),
			'out of nowhere'
		).toEqual([]);
		let place = start(build);
		for (const row of rows) {
			expect(hashText(row.text)).toBe(row.hash);
			place = next(place, row);
			expect(place.link).toBe(row.link);
		}
	} finally {
		db.close();
	}
});
