import { spawn } from 'node:child_process';
import type { ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import { createServer } from 'node:net';
import type { AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { test as base } from '@playwright/test';
import { ROOT } from '../../src/bin/prepare.js';

export interface LogLine {
	level: string;
	msg: string;
	[field: string]: unknown;
}

/**
 * The real server on a port and a data folder of its own. Start it, stop it, kill it, start it again
 * on the same port and data, as an operator or a power cut would.
 */
export class TestServer {
	readonly port: number;
	readonly url: string;
	readonly dataDir: string;
	/** Every line it has logged so far, over all its starts. */
	readonly log: LogLine[] = [];
	readonly #env: Record<string, string>;
	#child: ChildProcess | undefined;

	private constructor(port: number, dataDir: string, env: Record<string, string>) {
		this.port = port;
		this.url = `http://localhost:${port}`;
		this.dataDir = dataDir;
		this.#env = env;
	}

	static async start(env: Record<string, string> = {}): Promise<TestServer> {
		const server = new TestServer(
			await freePort(),
			mkdtempSync(join(tmpdir(), 'tallybar-e2e-')),
			env
		);
		await server.start();
		return server;
	}

	/** Resolves when it answers; rejects with what it printed when it ends instead. */
	async start(): Promise<void> {
		if (this.#child !== undefined) throw new Error('the server is already running');
		const child = spawn(process.execPath, ['src/bin/server.js'], {
			cwd: ROOT,
			env: {
				PATH: process.env.PATH,
				HOST: '127.0.0.1',
				PORT: String(this.port),
				DATA_DIR: this.dataDir,
				LOG_LEVEL: 'debug',
				...this.#env
			},
			stdio: ['ignore', 'pipe', 'pipe', 'ipc']
		});
		this.#child = child;
		let complaint = '';
		child.stderr?.on('data', (chunk: Buffer) => (complaint += chunk.toString()));
		let rest = '';
		child.stdout?.on('data', (chunk: Buffer) => {
			const lines = (rest + chunk.toString()).split('\n');
			rest = lines.pop() ?? '';
			// Throws on anything that is not JSON: stdout is the log and nothing else.
			for (const line of lines) this.log.push(JSON.parse(line) as LogLine);
		});
		await new Promise<void>((resolve, reject) => {
			child.once('message', () => {
				resolve();
			});
			child.once('exit', (code) => {
				this.#child = undefined;
				reject(new Error(`the server ended with ${code ?? 'a signal'}: ${complaint}`));
			});
		});
	}

	/** SIGTERM; resolves with the exit code, null when a signal ended it. */
	stop(): Promise<number | null> {
		return this.#end('SIGTERM');
	}

	/** SIGKILL, as the power going away. */
	async kill(): Promise<void> {
		await this.#end('SIGKILL');
	}

	async restart(): Promise<void> {
		await this.stop();
		await this.start();
	}

	/** Kills what still runs and removes the data. */
	async dispose(): Promise<void> {
		await this.kill();
		rmSync(this.dataDir, { recursive: true, force: true });
	}

	async #end(signal: NodeJS.Signals): Promise<number | null> {
		const child = this.#child;
		if (child === undefined) return null;
		const ended = once(child, 'close');
		child.kill(signal);
		const [code] = (await ended) as [number | null];
		this.#child = undefined;
		return code;
	}
}

export async function freePort(): Promise<number> {
	const probe = createServer();
	probe.listen(0, '127.0.0.1');
	await once(probe, 'listening');
	const { port } = probe.address() as AddressInfo;
	probe.close();
	await once(probe, 'close');
	return port;
}

/** `test` with a fresh running server for each test. */
export const test = base.extend<{ server: TestServer }>({
	// eslint-disable-next-line no-empty-pattern -- Playwright reads the fixtures from this pattern
	server: async ({}, use) => {
		const server = await TestServer.start();
		await use(server);
		await server.dispose();
	}
});

export { expect } from '@playwright/test';
