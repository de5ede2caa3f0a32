import { readdirSync, readFileSync } from 'node:fs';
import { join, resolve } from 'node:path';
import { describe, expect, it } from 'vitest';
import { ConfigError, parseConfig, VARIABLES } from './config';

/** Set or read by the tools around the server, not settings of a person's. */
const NOT_SETTINGS = new Set(['NODE_ENV', 'CI', 'PATH', 'HOME', 'TMPDIR']);

function sources(folder: string): string[] {
	return readdirSync(folder, { recursive: true, encoding: 'utf8' })
		.filter((name) => /\.(js|ts|svelte)$/.test(name))
		.map((name) => join(folder, name));
}

describe('configuration', () => {
	it('lists in .env.example every variable that is read, and no other', () => {
		const files = [
			...sources('src'),
			...sources('tests'),
			'playwright.config.ts',
			'vite.config.ts'
		];
		const read = new Set(VARIABLES);
		for (const file of files) {
			const text = readFileSync(resolve(file), 'utf8');
			for (const [, name] of text.matchAll(/process\.env(?:\.|\[')([A-Z][A-Z0-9_]*)/g)) {
				if (name !== undefined && !NOT_SETTINGS.has(name)) read.add(name);
			}
		}
		const listed = [...readFileSync('.env.example', 'utf8').matchAll(/^# ?([A-Z][A-Z0-9_]*)=/gm)];
		expect(listed.map((match) => match[1]).sort()).toEqual([...read].sort());
	});

	it('fills what is not set, and takes an empty variable as not set', () => {
		const config = parseConfig({ PORT: '4000', ORIGIN: '', LOG_LEVEL: '' });
		expect(config).toMatchObject({ port: 4000, origin: 'http://localhost:4000', logLevel: 'info' });
		expect(config.dataDir).toBe(resolve('data'));
	});

	it.each([
		[{ PORT: 'eighty' }, 'PORT'],
		[{ PORT: '70000' }, 'PORT'],
		[{ ORIGIN: 'log.example.org' }, 'ORIGIN'],
		[{ ORIGIN: 'https://log.example.org/app' }, 'ORIGIN'],
		[{ LOG_LEVEL: 'loud' }, 'LOG_LEVEL']
	])('refuses %j in one line that names the variable', (env, name) => {
		expect(() => parseConfig(env)).toThrow(ConfigError);
		expect(() => parseConfig(env)).toThrow(new RegExp(`^wrong setting: ${name}: [^\\n]+$`));
	});
});
