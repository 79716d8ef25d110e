/**
 * Makes a Node worker's port look like a browser's, for comlink: `message` events carry their value in `data`.
 */
import type { Endpoint } from 'comlink';

/** What we use of Node's MessagePort and Worker; spelled out so that the browser build needs no Node types. */
export type NodePort = {
  postMessage(message: unknown, transfer?: readonly unknown[]): void;
  on(type: string, listener: (value: unknown) => void): unknown;
  off(type: string, listener: (value: unknown) => void): unknown;
};

export function nodeEndpoint(port: NodePort): Endpoint {
  const wrappers = new WeakMap<object, (value: unknown) => void>();
  return {
    postMessage: (message: unknown, transfer?: Transferable[]) => {
      port.postMessage(message, transfer);
    },
    addEventListener: (type, listener) => {
      const wrapper = (data: unknown): void => {
        const event = { data } as MessageEvent; // comlink reads nothing but `data`
        if (typeof listener === 'function') listener(event);
        else listener.handleEvent(event);
      };
      wrappers.set(listener, wrapper);
      port.on(type, wrapper);
    },
    removeEventListener: (type, listener) => {
      const wrapper = wrappers.get(listener);
      if (wrapper) port.off(type, wrapper);
      wrappers.delete(listener);
    },
  };
}
