import { writeFile } from 'node:fs/promises';

import { NumericalError } from '#core/errors.ts';
import { AppError } from '#server/errors.ts';
import { toProblem } from '#server/respond.ts';

import { checkCommand } from './check.ts';
import { meshCommand } from './mesh.ts';
import { parseFlags, UsageError } from './flags.ts';

const USAGE = `Selvage on the command line: reads files, prints one JSON document.

  selvage mesh  --points FILE --recipe FILE [--radius-km 6371] [--out FILE]
      Points: CSV with the header x,y (km) or lon,lat (degrees), or GeoJSON. Recipe: JSON as the API takes it.
      Gives crs, nodes, triangles, observationNode (node of each selected observation), rowNode (node of each row
      read, -1 where it is left out) and timings. Indices count from 0.

  selvage check --mesh FILE (--daley-km D | --scale-km l) --steps m [--kind scalar|vector] [--rotational-share s]
                [--mass consistent|lumped] [--normalisation exact|theory] [--tolerance 0.01] [--radius-km 6371]
                [--accuracy 1e-8] [--policy FILE] [--map FILE] [--out FILE]
      Mesh: what "mesh" gives, or {"crs": "plane-km" | "lonlat-deg", "nodes": [[x, y], ...], "triangles": [[i, j, k], ...]}.
      --l-km is another name of --scale-km. Map: JSON array with the node of each observation. Policy: JSON object of
      {"finding id": {"warn": number | null, "fail": number | null}}. Accuracy is that of exact variances, which no
      finding of this version uses.

Without --out the document goes to standard output. Errors go to standard error as problem details; exit code 1.
`;

const run = async (argv: string[]): Promise<void> => {
  const [verb, ...rest] = argv;
  if (verb === undefined || verb === 'help' || verb === '--help' || verb === '-h') {
    process.stdout.write(USAGE);
    return;
  }
  const commands = { mesh: meshCommand, check: checkCommand };
  const command = Object.hasOwn(commands, verb) ? commands[verb as keyof typeof commands] : undefined;
  if (!command) throw new UsageError(`There is no verb "${verb}". Use mesh or check; "selvage help" tells more.`);
  const flags = parseFlags(rest, command.flags);
  const document = `${JSON.stringify(await command.run(flags))}\n`;
  if (flags.out === undefined) process.stdout.write(document);
  else await writeFile(flags.out, document);
};

run(process.argv.slice(2)).catch((error: unknown) => {
  const known =
    error instanceof NumericalError || error instanceof AppError
      ? error
      : new AppError('BAD_REQUEST', error instanceof Error ? error.message : String(error), { cause: error });
  process.stderr.write(`${JSON.stringify(toProblem(known).problem)}\n`);
  process.exitCode = 1;
});
