import { createPinia } from 'pinia'
import { createApp } from 'vue'
import { createMemoryHistory } from 'vue-router'
import App from '../../src/App.vue'
import { makeRouter } from '../../src/router/index.ts'
import { useWorkshopStore } from '../../src/stores/workshop.ts'
import '../../src/styles/index.css'
import { bench, scene } from './scenes.ts'

const history = createMemoryHistory()
history.replace(scene.path)
const app = createApp(App).use(createPinia())
useWorkshopStore().chooseBench(bench.id)
const router = makeRouter(history)
app.use(router)
await router.push(scene.path)
app.mount('#app')
