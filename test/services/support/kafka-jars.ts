import { mkdir, mkdtemp, rename, rm, stat, writeFile } from 'node:fs/promises'
import { join } from 'node:path'
import { alone, cacheFolder, findProgram, run, runOrThrow } from '../../support/host.ts'

const version = '4.3.1'

/** The broker, its command-line tools without those of Connect, and a log on stderr. */
const pom = `<project xmlns="http://maven.apache.org/POM/4.0.0">
  <modelVersion>4.0.0</modelVersion>
  <groupId>tautline.test</groupId>
  <artifactId>kafka-jars</artifactId>
  <version>1</version>
  <packaging>pom</packaging>
  <dependencies>
    <dependency><groupId>org.apache.kafka</groupId><artifactId>kafka_2.13</artifactId><version>${version}</version></dependency>
    <dependency>
      <groupId>org.apache.kafka</groupId><artifactId>kafka-tools</artifactId><version>${version}</version>
      <exclusions>
        <exclusion><groupId>org.apache.kafka</groupId><artifactId>connect-runtime</artifactId></exclusion>
      </exclusions>
    </dependency>
    <dependency><groupId>org.slf4j</groupId><artifactId>slf4j-simple</artifactId><version>1.7.36</version></dependency>
  </dependencies>
</project>
`

/** Major version that `java -version` states, such as 17; null when it cannot be run. */
async function javaVersion(java: string): Promise<number | null> {
  const { stderr } = await run(java, ['-version'])
  const stated = /version "(\d+)/.exec(stderr)
  return stated ? Number(stated[1]) : null
}

/** Path of a Java of version 17 or later, from JAVA_HOME or the PATH. */
async function findJava(): Promise<string | null> {
  const home = process.env.JAVA_HOME
  for (const java of [home ? join(home, 'bin', 'java') : null, findProgram('java')])
    if (java && ((await javaVersion(java)) ?? 0) >= 17) return java
  return null
}

/**
 * The broker's jars from Maven Central, fetched once into the cache folder.
 * Returns Java and the folder of jars, or throws with what is missing.
 */
export async function kafkaJars(): Promise<{ java: string; jars: string }> {
  const java = await findJava()
  if (!java) throw new Error('no Java of version 17 or later')
  const jars = join(cacheFolder, `kafka-${version}`)
  await alone('kafka-jars', async () => {
    if (await stat(jars).catch(() => null)) return
    const maven = findProgram('mvn')
    if (!maven) throw new Error('no Maven (mvn)')
    await mkdir(cacheFolder, { recursive: true })
    const work = await mkdtemp(join(cacheFolder, 'kafka-fetch-'))
    try {
      await writeFile(join(work, 'pom.xml'), pom)
      const goal = ['dependency:copy-dependencies', `-DoutputDirectory=${work}/lib`, '-DincludeScope=runtime']
      await runOrThrow(maven, ['-q', '-B', ...goal], { cwd: work })
      await rename(join(work, 'lib'), jars)
    } finally {
      await rm(work, { recursive: true, force: true })
    }
  })
  return { java, jars }
}
