import { join } from 'node:path';
import { hashWith } from '$lib/logbook/bytes';
import { config } from './config';
import { closeDb, getDb } from './db';
import { log } from './logger';
import { getLog } from './log/log-server';
import { migrate } from './migrate';
import { NODE_SHA256 } from './node-hash';
import { tallybarProcess, whenDrained } from './process';

/** Everything that must have happened before the first request. What it throws stops the start. */
export async function start(): Promise<void> {
	const shared = tallybarProcess();
	shared.config = config();
	shared.log = log();
	hashWith(NODE_SHA256);
	const applied = await migrate(getDb(), join(config().dataDir, 'backups'));
	if (applied.length > 0) log().info({ applied }, 'database brought up to date');
	// A server whose key cannot be read must not make another: see log/server-key.ts.
	getLog();
	whenDrained(closeDb);
}
