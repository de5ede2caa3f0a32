import { resolve } from 'node:path';
import { z } from 'zod';

/** The environment holds something the server cannot run with; the message is one clear line. */
export class ConfigError extends Error {
	override name = 'ConfigError';
}

const port = z.coerce.number().int().min(1).max(65_535);

const origin = z
	.string()
	.refine(
		(text) => /^https?:/.test(text) && URL.canParse(text) && new URL(text).origin === text,
		'must be scheme, host and port only, such as https://log.example.org'
	);

/** Every variable the server reads. `.env.example` lists the same names; a test compares them. */
const environment = z
	.object({
		PORT: port.default(3000),
		HOST: z.string().default('0.0.0.0'),
		ORIGIN: origin.optional(),
		DATA_DIR: z.string().default('data'),
		LOG_LEVEL: z
			.enum(['trace', 'debug', 'info', 'warn', 'error', 'fatal', 'silent'])
			.default('info'),
		ADDRESS_HEADER: z.string().optional(),
		XFF_DEPTH: z.coerce.number().int().min(1).default(1)
	})
	.transform((env) => ({
		port: env.PORT,
		host: env.HOST,
		/** The address people type. Form posts from any other origin are refused. */
		origin: env.ORIGIN ?? `http://localhost:${env.PORT}`,
		/** Absolute. Everything the server keeps lies below it. */
		dataDir: resolve(env.DATA_DIR),
		logLevel: env.LOG_LEVEL,
		/** The header a trusted proxy writes the caller's address into, if there is one. */
		addressHeader: env.ADDRESS_HEADER,
		xffDepth: env.XFF_DEPTH
	}));

export type Config = z.infer<typeof environment>;

export const VARIABLES: readonly string[] = Object.keys(environment.in.shape);

/**
 * Reads the configuration. An empty variable counts as one not set, so that a copied
 * `.env.example` works. Throws ConfigError.
 */
export function parseConfig(env: Record<string, string | undefined>): Config {
	const given = Object.fromEntries(VARIABLES.map((name) => [name, env[name] || undefined]));
	const result = environment.safeParse(given);
	if (result.success) return result.data;
	const problems = result.error.issues.map((issue) => `${issue.path.join('.')}: ${issue.message}`);
	throw new ConfigError(`wrong setting: ${problems.join('; ')}`);
}

let current: Config | undefined;

/** The configuration of this process, read once. */
export function config(): Config {
	return (current ??= parseConfig(process.env));
}
