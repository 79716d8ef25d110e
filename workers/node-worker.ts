/** Starts a Node thread from a built worker file. */
import { Worker } from 'node:worker_threads';
import { nodeEndpoint } from './node-endpoint.ts';
import type { WorkerHandle } from './pool.ts';

export function startNodeWorker(url: URL): WorkerHandle {
  const worker = new Worker(url);
  return {
    endpoint: nodeEndpoint(worker),
    terminate: () => void worker.terminate(),
    onEnd: (listener) => {
      worker.on('error', (error) => listener(error.message));
      worker.on('exit', (code) => listener(`the worker ended with code ${code}`));
    },
  };
}
