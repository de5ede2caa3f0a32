/** `npm run bench`: everything that is measured, in order; the table on stdout, the figures as JSON. */
import { mkdirSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { ROOT } from '../../src/bin/prepare.js';
import { bytes, type ImportBuilt } from './bytes';
import { carry } from './carry';
import { children } from './cpu';
import { openOffline, readCold, seamToOpen, visit } from './open';
import { push, type PushCase } from './push';
import { machine, table, type Row } from './report';
import { tapEmpty, tapIn } from './tap';

const RESULTS = join(ROOT, 'build/bench.json');

interface Sizes {
	readonly entries: number;
	readonly carryRounds: number;
	readonly taps: number;
	readonly opens: number;
	readonly present: number;
	readonly pushTurns: number;
	readonly pushCases: readonly PushCase[];
}

const FULL: Sizes = {
	entries: 20_000,
	carryRounds: 3,
	taps: 400,
	opens: 20,
	present: 200_000,
	pushTurns: 8,
	pushCases: [
		{ batch: 1, clients: 1, pushes: 25 },
		{ batch: 1, clients: 8, pushes: 10 },
		{ batch: 100, clients: 1, pushes: 5 },
		{ batch: 100, clients: 8, pushes: 2 },
		{ batch: 200, clients: 1, pushes: 3 },
		{ batch: 200, clients: 8, pushes: 1 }
	]
};
const QUICK: Sizes = {
	entries: 1000,
	carryRounds: 1,
	taps: 100,
	opens: 3,
	present: 4000,
	pushTurns: 3,
	pushCases: [
		{ batch: 1, clients: 1, pushes: 20 },
		{ batch: 100, clients: 1, pushes: 4 }
	]
};

interface Options {
	readonly quick: boolean;
	/** Only these parts: tap, carry (with open and the taps in a full store), push, bytes. */
	readonly only: readonly string[];
	readonly importBuilt: ImportBuilt;
}

export async function bench(options: Options): Promise<void> {
	try {
		await run(options);
	} catch (error) {
		// Servers and browsers of a part that broke off.
		for (const pid of children()) process.kill(pid);
		throw error;
	}
}

async function run(options: Options): Promise<void> {
	const sizes = options.quick ? QUICK : FULL;
	const wanted = (part: string) => options.only.length === 0 || options.only.includes(part);
	const before = machine();
	const started = Date.now();
	console.log(
		`${before.cpu}, ${before.cores} cores, Node ${before.node}, load ${before.load.join(' ')}`
	);
	const rows: Row[] = [];
	let loaded: readonly string[] = [];
	if (wanted('tap')) {
		say('tap to durable, empty store');
		rows.push(await tapEmpty(sizes.taps));
	}
	if (wanted('carry')) {
		const full = await inFullStore(sizes);
		rows.push(...full.rows);
		loaded = full.loaded;
	}
	if (wanted('push')) {
		say('pushes');
		const { present, pushTurns: turns, pushCases: cases } = sizes;
		rows.push(...(await push({ present, turns, cases, say })));
	}
	if (wanted('bytes')) rows.push(...(await bytes(loaded, options.importBuilt)));

	const after = machine();
	console.log(`\n${table(rows)}\n`);
	for (const { name, note } of rows) if (note !== undefined) console.log(`${name}: ${note}`);
	console.log(
		`\nload ${before.load.join(' ')} before, ${after.load.join(' ')} after; ${((Date.now() - started) / 1000).toFixed(0)} s`
	);
	mkdirSync(dirname(RESULTS), { recursive: true });
	writeFileSync(
		RESULTS,
		`${JSON.stringify({ at: new Date().toISOString(), quick: options.quick, before, after, rows }, null, '\t')}\n`
	);
	console.log(`figures: ${RESULTS}`);
}

/** What is measured with thousands of entries in a browser's store. */
async function inFullStore(
	sizes: Sizes
): Promise<{ rows: readonly Row[]; loaded: readonly string[] }> {
	const { entries } = sizes;
	say('browser to server to browser');
	const {
		rows: carried,
		server,
		reader,
		person,
		build
	} = await carry({
		entries,
		rounds: sizes.carryRounds,
		say
	});
	const { url } = server;
	const full = { browser: reader, url, person, build, entries };
	try {
		say('a cold store');
		const seam = await seamToOpen(full);
		const cold = await readCold(full, seam, sizes.opens);
		say('tap to durable, full store');
		const name = `tap to durable, ${entries.toLocaleString('en')} entries`;
		const tap = await tapIn({ ...full, name }, sizes.taps);
		say('open the bench offline');
		const loaded = await visit(full, seam);
		await server.stop();
		const opened = await openOffline(full, seam, sizes.opens);
		return { rows: [tap, opened, cold, ...carried], loaded };
	} finally {
		await reader.close();
		await server.dispose();
	}
}

function say(text: string): void {
	console.log(text);
}
