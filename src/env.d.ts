/// <reference types="astro/client" />

declare namespace App {
  interface Locals {
    ctx: import('#server/context.ts').Context;
  }
}
