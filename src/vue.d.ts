// For tools that read .ts files without the Vue compiler (typed lint); vue-tsc resolves the real file first.
declare module '*.vue' {
  import type { DefineComponent } from 'vue'
  const component: DefineComponent
  export default component
}
