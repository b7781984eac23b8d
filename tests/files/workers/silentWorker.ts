// A module that forgets to serve jobs.
export {};
