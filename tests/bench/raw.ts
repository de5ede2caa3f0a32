/** The raw server, from outside. */
import { fork } from 'node:child_process';
import type { ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { ROOT } from '../../src/bin/prepare.js';

export class RawServer {
	readonly url: string;
	readonly pid: number | undefined;
	readonly #child: ChildProcess;
	readonly #folder: string;

	private constructor(port: number, child: ChildProcess, folder: string) {
		this.url = `http://localhost:${port}`;
		this.pid = child.pid;
		this.#child = child;
		this.#folder = folder;
	}

	static async start(): Promise<RawServer> {
		const folder = mkdtempSync(join(tmpdir(), 'tallybar-raw-'));
		const child = fork(join(ROOT, 'tests/bench/raw-server.js'), [join(folder, 'raw.db')]);
		const [{ port }] = (await once(child, 'message')) as [{ port: number }];
		return new RawServer(port, child, folder);
	}

	async stop(): Promise<void> {
		const ended = once(this.#child, 'exit');
		this.#child.kill();
		await ended;
		rmSync(this.#folder, { recursive: true, force: true });
	}
}
