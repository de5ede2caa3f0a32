// The floor of every figure with a server in it: node:http over better-sqlite3, one transaction and one prepared
// insert for each line, durable as the real one, and nothing checked. In a process of its own, as the real one is.
import { once } from 'node:events';
import { createServer } from 'node:http';
import Sqlite from 'better-sqlite3';

const [file = ''] = process.argv.slice(2);
const sqlite = new Sqlite(file);
sqlite.pragma('journal_mode = WAL');
sqlite.pragma('synchronous = FULL');
sqlite.exec('create table if not exists line (seq integer primary key, text text not null) strict');
const insert = sqlite.prepare('insert into line (text) values (?)');
const page = sqlite.prepare('select seq, text from line where seq > ? order by seq limit 1000');
const keep = sqlite.transaction((/** @type {string[]} */ texts) => {
	for (const text of texts) insert.run(text);
});

const server = createServer((request, response) => {
	answer(request, response).catch((/** @type {unknown} */ error) => {
		response.statusCode = 500;
		response.end(String(error));
	});
});

/**
 * @param {import('node:http').IncomingMessage} request
 * @param {import('node:http').ServerResponse} response
 */
async function answer(request, response) {
	const url = new URL(request.url ?? '/', 'http://localhost');
	if (request.method === 'POST') {
		/** @type {Buffer[]} */
		const chunks = [];
		for await (const chunk of /** @type {AsyncIterable<Buffer>} */ (request)) chunks.push(chunk);
		const { entries } = /** @type {{ entries: string[] }} */ (
			JSON.parse(Buffer.concat(chunks).toString())
		);
		keep(entries);
		json(response, { kept: entries.length });
	} else if (url.pathname === '/lines') {
		json(response, page.all(Number(url.searchParams.get('after'))));
	} else if (url.pathname === '/empty') {
		sqlite.exec('delete from line');
		json(response, {});
	} else {
		response.setHeader('Content-Type', 'text/html; charset=utf-8');
		response.end('<!doctype html><title>floor</title>');
	}
}

/**
 * @param {import('node:http').ServerResponse} response
 * @param {unknown} value
 */
function json(response, value) {
	response.setHeader('Content-Type', 'application/json');
	response.end(JSON.stringify(value));
}

server.listen(0, '127.0.0.1');
await once(server, 'listening');
const address = server.address();
process.send?.({ port: typeof address === 'object' ? address?.port : undefined });
process.on('disconnect', () => process.exit(0));
